// Time of a training from nothing until a look, confirmed on 1 000 drawn sites and on the nominal one, meets
// the level of the shipped policies.
//   bench_train_time [--robot NAME] [--seed N] [--threads N] [--instructions SET] [--quick]
// The clock of the processor counts, not the one on the wall: other programs must not make training look
// slower. Both are printed.
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <chrono>
#include <ctime>
#include <stdexcept>

#include "proto/files/robot_file.h"
#include "tests/bench/promise.h"
#include "tools/train/packed_trials.h"
#include "tools/train/sites.h"
#include "tools/train/train.h"
#include "tools/train/trot.h"
#include "tools/train/walk.h"

namespace pastern {
namespace {

double processor_s() {
  timespec now{};
  ::clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
  return static_cast<double>(now.tv_sec) + 1e-9 * static_cast<double>(now.tv_nsec);
}

struct Level {
  bool met{false};
  tools::Look wide;
  tools::Look nominal;
};

class Training {
 public:
  Training(const std::string& name, std::uint64_t seed, unsigned threads, bool quick,
           packed::InstructionSet set)
      : threads_(threads), quick_(quick), set_(set) {
    files::Defects defects;
    const auto robot = files::read_robot(
        std::string(PASTERN_SOURCE_DIR) + "/hal_stub/robots/" + name + ".robot.txtpb", defects);
    if (!robot) throw std::runtime_error(files::lines(defects));
    const v1::Policy policy = tools::open_loop_trot(robot->robot());
    std::string error;
    setting_ = tools::WalkSetting::make(robot->robot(), policy, 5, error);
    if (!setting_) throw std::runtime_error(error);
    settings_.seed = seed;
    if (quick) settings_.iterations = 20;
    trainer_ = std::make_unique<tools::Trainer>(
        settings_, Parameters(policy.parameters().begin(), policy.parameters().end()),
        trials(tools::drawn_sites(tools::wide_ranges())));
  }

  // Ends at the first look that is confirmed, or with the last iteration.
  Level run() {
    Level level;
    std::size_t looks = 0;
    while (!level.met && trainer_->step()) {
      if (trainer_->looks().size() == looks) continue;
      looks = trainer_->looks().size();
      const v1::TrainingLook& look = trainer_->looks().back();
      fmt::print(stderr, "{:>7} walks  return {:.3f}  falls {:.1f} %\n", look.walks(), look.mean_return(),
                 100 * look.falls());
      const bool likely = look.mean_return() >= 2.9 && look.falls() <= 0.01;
      if (likely || trainer_->done())
        level = confirm(trainer_->done() ? trainer_->best() : trainer_->centre());
    }
    return level;
  }

  [[nodiscard]] std::uint64_t walks() const { return trainer_->walks(); }

 private:
  std::unique_ptr<tools::Trials> trials(const tools::SiteChoice& sites) const {
    return tools::packed_trials(setting_, sites, threads_, set_);
  }

  Level confirm(const Parameters& parameters) const {
    const std::size_t walks = quick_ ? 50 : 1000;
    Level level;
    level.wide = tools::look_at(*trials(tools::drawn_sites(tools::wide_ranges())), parameters, 77, 0, walks);
    const stub::Site nominal = stub::nominal_site(setting_->model());
    level.nominal = tools::look_at(*trials(tools::one_site(nominal)), parameters, 77, 0, walks / 5);
    level.met = level.wide.mean_return >= 2.9 && level.wide.falls <= 0.01 &&
                level.nominal.mean_return >= 3.1 && level.nominal.speed_m_per_s >= 0.6;
    return level;
  }

  unsigned threads_;
  bool quick_;
  packed::InstructionSet set_;
  tools::TrainerSettings settings_{tools::start_policy_settings()};
  std::shared_ptr<const tools::WalkSetting> setting_;
  std::unique_ptr<tools::Trainer> trainer_;
};

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"Time of a training from nothing to the level of the shipped policies"};
  std::string robot = "dunlin12";
  std::uint64_t seed = 1;
  unsigned threads = 2;
  bool quick = false;
  std::string instructions;
  app.add_option("--robot", robot, "dunlin8 or dunlin12");
  app.add_option("--seed", seed, "seed of the training");
  app.add_option("--threads", threads, "threads");
  app.add_option("--instructions", instructions, "plain, avx2, avx512 or neon; the widest when not said");
  app.add_flag("--quick", quick, "20 iterations only: shows that it runs, not that it arrives");
  CLI11_PARSE(app, argc, argv);
  const auto began = std::chrono::steady_clock::now();
  std::string error;
  const auto set = packed::set_named(instructions, error);
  if (!set) return std::fprintf(stderr, "%s\n", error.c_str()), 2;
  Training training(robot, seed, threads, quick, *set);
  const Level level = training.run();
  const double wall = std::chrono::duration<double>(std::chrono::steady_clock::now() - began).count();
  const double share = processor_s() / threads;
  bench::promise("train " + robot + " from nothing to the shipped level, processor seconds a thread",
                 fmt::format("{:.0f} s on {} threads, {} walks{}", share, threads, training.walks(),
                             level.met ? "" : ", level not met"),
                 "<= 30 s on 2", level.met && share * threads <= 60);
  bench::printed("train " + robot + ": wall", fmt::format("{:.0f} s", wall));
  bench::printed(
      "train " + robot + ": confirmed level",
      fmt::format("wide {:.3f}, falls {:.1f} %; nominal {:.3f}, {:.2f} m/s", level.wide.mean_return,
                  100 * level.wide.falls, level.nominal.mean_return, level.nominal.speed_m_per_s));
  return 0;
}
