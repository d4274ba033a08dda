// Two rounds: robots of lots that are new stand up, then all walk. In each an atomic counter is the queue
// that the threads' lanes take from.
#include "tools/packed/fleet.h"

#include <algorithm>
#include <array>
#include <atomic>
#include <exception>
#include <mutex>
#include <stdexcept>
#include <string>

#include "tools/train/pool.h"

namespace pastern::packed {
namespace {

/// Robots whose step goes another way round otherwise in the last digits: they never share lanes, so that a
/// score does not depend on company.
std::size_t kind_of(const stub::SiteFigures<double>& site) {
  const auto& around = site.around;
  return (site.drives.plain ? 0U : 1U) + (around.trunk.weighed ? 2U : 0U) + (around.hangs ? 4U : 0U) +
         (around.ground.plain ? 0U : 8U);
}
constexpr std::size_t kKinds = 16;

constexpr std::size_t kMostStood = 4096;  // about 10 kB each

/// The next entry of a list for whoever asks first; after a failure there is none.
class Queue {
 public:
  explicit Queue(std::size_t count) : count_(count) {}

  bool next(std::size_t& i) {
    i = next_.fetch_add(1);
    return i < count_;
  }
  /// Walkers do not expect exceptions: the first is kept for the end.
  void fail(std::exception_ptr failure) {
    next_.store(count_);
    const std::lock_guard<std::mutex> lock(failed_);
    if (!failure_) failure_ = std::move(failure);
  }
  void check() const {
    if (failure_) std::rethrow_exception(failure_);
  }

 private:
  std::size_t count_;
  std::atomic<std::size_t> next_{0};
  std::mutex failed_;
  std::exception_ptr failure_;
};

}  // namespace

/// What this rank does.
struct Fleet::Plan {
  std::vector<int> owner;           // rank of each trial: that of its lot
  std::vector<std::size_t> mine;    // trials of this rank
  std::vector<tools::Lot> unstood;  // its lots of which no robot stands yet, each once
};

class Fleet::Stands final : public StandDesk {
 public:
  Stands(Fleet& fleet, Queue& queue, const std::vector<tools::Lot>& lots, const std::vector<Stood*>& places)
      : fleet_(fleet), queue_(queue), lots_(lots), places_(places) {}

  bool next(OnMark& robot, std::size_t& id) override {
    if (!queue_.next(id)) return false;
    try {
      const tools::WalkChance chance = tools::chance_of(lots_[id]);
      const stub::Site site = fleet_.choose_(*fleet_.settings_->model, lots_[id]);
      robot = on_mark(*fleet_.settings_, site, chance.seed, chance.draw);
      robot.roll_error = chance.roll_error_rad;
      robot.pitch_error = chance.pitch_error_rad;
      return true;
    } catch (...) {
      queue_.fail(std::current_exception());
      return false;
    }
  }
  void again(std::size_t id, OnMark& robot) override {
    put_on_feet(*fleet_.settings_, fleet_.choose_(*fleet_.settings_->model, lots_[id]), robot);
  }
  void done(std::size_t id, Stood&& stood) override { *places_[id] = std::move(stood); }

 private:
  Fleet& fleet_;
  Queue& queue_;
  const std::vector<tools::Lot>& lots_;
  const std::vector<Stood*>& places_;
};

class Fleet::Walks final : public WalkDesk {
 public:
  Walks(const Fleet& fleet, Queue& queue, const std::vector<std::size_t>& mine, std::span<const Trial> trials,
        std::span<tools::Score> scores)
      : fleet_(fleet), queue_(queue), mine_(mine), trials_(trials), scores_(scores) {}

  bool next(WalkTask& task, std::size_t& id) override {
    std::size_t i = 0;
    if (!queue_.next(i)) return false;
    id = mine_[i];
    task = {&fleet_.stood_.at(trials_[id].lot), trials_[id].parameters->data()};
    return true;
  }
  void done(std::size_t id, const WalkEnd& end) override {
    scores_[id] = {episode::terms(end.sums, fleet_.settings_->weights, end.fell), end.fell, end.distance_m};
  }

 private:
  const Fleet& fleet_;
  Queue& queue_;
  const std::vector<std::size_t>& mine_;
  std::span<const Trial> trials_;
  std::span<tools::Score> scores_;
};

Fleet::Fleet(std::shared_ptr<const WalkSettings> settings, tools::SiteChoice choose,
             const FleetOptions& options, const Ranks* ranks)
    : settings_(std::move(settings)),
      choose_(std::move(choose)),
      ranks_(ranks),
      set_(ranks != nullptr ? ranks->common_set(options.set) : options.set) {
  const unsigned threads = options.threads > 0 ? options.threads : tools::all_threads();
  for (unsigned n = 0; n < threads; ++n) walkers_.push_back(make_walker(settings_, set_, options.numbers));
}

Fleet::~Fleet() = default;

Fleet::Plan Fleet::plan(std::span<const Trial> trials) const {
  Plan plan;
  const int rank = ranks_ != nullptr ? ranks_->rank() : 0;
  const int count = ranks_ != nullptr ? ranks_->count() : 1;
  std::map<tools::Lot, int, LotOrder> owner_of;
  for (std::size_t i = 0; i < trials.size(); ++i) {
    const auto next = static_cast<int>(owner_of.size() % static_cast<std::size_t>(count));
    const auto [lot, is_new] = owner_of.try_emplace(trials[i].lot, next);
    plan.owner.push_back(lot->second);
    if (lot->second != rank) continue;
    plan.mine.push_back(i);
    if (is_new && !stood_.contains(trials[i].lot)) plan.unstood.push_back(trials[i].lot);
  }
  return plan;
}

void Fleet::stand_up(const Plan& plan) {
  std::array<std::vector<tools::Lot>, kKinds> lots;
  for (const tools::Lot& lot : plan.unstood) {
    const tools::WalkChance chance = tools::chance_of(lot);
    const stub::Site site = choose_(*settings_->model, lot);
    lots[kind_of(on_mark(*settings_, site, chance.seed, chance.draw).site)].push_back(lot);
  }
  for (const std::vector<tools::Lot>& alike : lots) {
    if (!alike.empty()) stand_up(alike);
  }
}

void Fleet::stand_up(const std::vector<tools::Lot>& lots) {
  std::vector<Stood*> places;
  places.reserve(lots.size());
  for (const tools::Lot& lot : lots) places.push_back(&stood_[lot]);
  Queue queue(lots.size());
  const auto threads = static_cast<unsigned>(walkers_.size());
  tools::spread(threads, threads, [&](unsigned, std::size_t worker) {
    Stands desk(*this, queue, lots, places);
    walkers_[worker]->stand_up(desk);
  });
  queue.check();
}

void Fleet::walk(const Plan& plan, std::span<const Trial> trials, std::span<tools::Score> scores) {
  // Lanes whose commands are equally late look for them in the same place: 4 % more walks a second.
  const auto late = [&](std::size_t i) { return stood_.at(trials[i].lot).mark.command_delay; };
  std::array<std::vector<std::size_t>, kKinds> mine;
  for (const std::size_t i : plan.mine) mine[kind_of(stood_.at(trials[i].lot).mark.site)].push_back(i);
  for (std::vector<std::size_t>& alike : mine) {
    if (alike.empty()) continue;
    std::stable_sort(alike.begin(), alike.end(),
                     [&](std::size_t a, std::size_t b) { return late(a) < late(b); });
    Queue queue(alike.size());
    const auto threads = static_cast<unsigned>(walkers_.size());
    tools::spread(threads, threads, [&](unsigned, std::size_t worker) {
      Walks desk(*this, queue, alike, trials, scores);
      walkers_[worker]->walk(desk);
    });
  }
}

void Fleet::share(const Plan& plan, std::span<tools::Score> scores) const {
  constexpr std::size_t width = 7;
  std::vector<double> rows(scores.size() * width);
  for (std::size_t i = 0; i < scores.size(); ++i) {
    const EpisodeReturn& t = scores[i].terms;
    const std::array<double, width> row = {
        t.forward, t.energy, t.drift, t.turn, t.fall, scores[i].fell ? 1.0 : 0.0, scores[i].distance_m};
    std::copy(row.begin(), row.end(), rows.begin() + static_cast<std::ptrdiff_t>(i * width));
  }
  ranks_->gather(plan.owner, width, rows.data());
  for (std::size_t i = 0; i < scores.size(); ++i) {
    const double* row = rows.data() + i * width;
    scores[i] = {{row[0], row[1], row[2], row[3], row[4]}, row[5] > 0, row[6]};
  }
}

void Fleet::check(std::span<const Trial> trials, std::span<tools::Score> scores) const {
  const auto refuse = [](const std::string& what, std::size_t found, std::size_t expected) {
    throw std::invalid_argument(what + std::to_string(found) + ", expected " + std::to_string(expected));
  };
  if (scores.size() != trials.size()) refuse("places for scores: ", scores.size(), trials.size());
  const std::size_t wanted = settings_->shape.parameter_count;
  for (std::size_t i = 0; i < trials.size(); ++i) {
    const std::size_t found = trials[i].parameters != nullptr ? trials[i].parameters->size() : 0;
    if (found != wanted) refuse("trial " + std::to_string(i) + ", parameters: ", found, wanted);
  }
}

void Fleet::run(std::span<const Trial> trials, std::span<tools::Score> scores) {
  check(trials, scores);
  Plan made = plan(trials);
  if (stood_.size() + made.unstood.size() > kMostStood) {
    stood_.clear();
    made = plan(trials);
  }
  try {
    stand_up(made);
  } catch (...) {
    stood_.clear();  // places without a robot in them
    throw;
  }
  walk(made, trials, scores);
  if (ranks_ != nullptr) share(made, scores);
}

}  // namespace pastern::packed
