// A fleet walks all that lanes can; the rest is walked one by one.
#include "tools/train/packed_trials.h"

#include <utility>

#include "tools/packed/fleet.h"

namespace pastern::tools {
namespace {

class PackedTrials final : public Trials {
 public:
  PackedTrials(std::shared_ptr<const WalkSetting> setting, SiteChoice choose, unsigned threads,
               packed::InstructionSet set, const packed::Ranks* ranks)
      : setting_(std::move(setting)),
        choose_(std::move(choose)),
        threads_(threads),
        fleet_(setting_->for_lanes(), choose_, {threads, set, packed::Numbers::single}, ranks) {}

  std::vector<Score> run(const std::vector<Trial>& trials) override {
    std::vector<Trial> sound;
    std::vector<Trial> faulty;
    std::vector<bool> is_faulty;
    for (const Trial& trial : trials) {
      is_faulty.push_back(has_faults(trial.lot));
      if (is_faulty.back()) faulty.push_back(trial);
      if (!is_faulty.back()) sound.push_back(trial);
    }
    std::vector<Score> scores(sound.size());
    fleet_.run(sound, scores);
    if (faulty.empty()) return scores;
    const std::vector<Score> others =
        run_on(courses_for(std::make_unique<WalkCourse>(setting_, choose_), threads_), faulty);
    std::vector<Score> all;
    for (std::size_t i = 0, of_sound = 0, of_faulty = 0; i < trials.size(); ++i) {
      all.push_back(is_faulty[i] ? others[of_faulty++] : scores[of_sound++]);
    }
    return all;
  }
  [[nodiscard]] double duration_s() const override {
    return setting_->for_lanes()->ticks * setting_->for_lanes()->period_s;
  }

 private:
  [[nodiscard]] bool has_faults(const Lot& lot) const {
    return choose_(setting_->model(), lot).fault_count > 0;
  }

  std::shared_ptr<const WalkSetting> setting_;
  SiteChoice choose_;
  unsigned threads_;
  packed::Fleet fleet_;
};

}  // namespace

std::unique_ptr<Trials> packed_trials(std::shared_ptr<const WalkSetting> setting, SiteChoice choose,
                                      unsigned threads, packed::InstructionSet set,
                                      const packed::Ranks* ranks) {
  return std::make_unique<PackedTrials>(std::move(setting), std::move(choose), threads, set, ranks);
}

std::unique_ptr<Trials> WalkCourse::by_lanes(unsigned threads) const {
  return packed_trials(setting_, choose_, threads);
}

}  // namespace pastern::tools
