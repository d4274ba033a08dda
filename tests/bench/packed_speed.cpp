// Simulated seconds per second of one core, everything in: policy, PD, clamps, drives, heat, pack, sensors
// with noise, bus, pushes, falls, return; rising and standing before the walks timed beside them. One pinned
// thread, its own processor time, sets of instructions interleaved, median of the rounds.
//   bench_packed_speed [--robot NAME] [--walks N] [--rounds N] [--seed N] [--quick]
#include <fmt/format.h>
#include <sched.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <ctime>
#include <map>

#include "tests/bench/packed_yard.h"
#include "tests/bench/promise.h"

namespace pastern {
namespace {

double thread_s() {
  timespec now{};
  ::clock_gettime(CLOCK_THREAD_CPUTIME_ID, &now);
  return static_cast<double>(now.tv_sec) + 1e-9 * static_cast<double>(now.tv_nsec);
}

void pin_here() {
  cpu_set_t one;
  CPU_ZERO(&one);
  CPU_SET(static_cast<unsigned>(std::max(0, ::sched_getcpu())), &one);
  static_cast<void>(::sched_setaffinity(0, sizeof one, &one));
}

/// Robots of drawn sites that stand, and their walks, counted in ticks.
class Stands final : public packed::StandDesk {
 public:
  Stands(const bench::Yard& yard, std::size_t count, std::uint64_t seed)
      : yard_(yard), seed_(seed), stood(count) {}

  bool next(packed::OnMark& robot, std::size_t& id) override {
    if (at_ == stood.size()) return false;
    id = at_++;
    const tools::WalkChance chance = tools::chance_of({seed_, id});
    robot = packed::on_mark(*yard_.setting->for_lanes(), site(id), chance.seed, chance.draw);
    robot.roll_error = chance.roll_error_rad;
    robot.pitch_error = chance.pitch_error_rad;
    return true;
  }
  void again(std::size_t id, packed::OnMark& robot) override {
    packed::put_on_feet(*yard_.setting->for_lanes(), site(id), robot);
  }
  void done(std::size_t id, packed::Stood&& one) override {
    ticks += one.ticks;
    stood[id] = std::move(one);
  }

 private:
  [[nodiscard]] stub::Site site(std::size_t id) const {
    return tools::draw_site(yard_.setting->model(), tools::wide_ranges(), seed_, id);
  }
  const bench::Yard& yard_;
  std::uint64_t seed_;
  std::size_t at_{0};

 public:
  std::vector<packed::Stood> stood;
  std::uint64_t ticks{0};
};

class Walks final : public packed::WalkDesk {
 public:
  Walks(const bench::Yard& yard, const std::vector<packed::Stood>& stood) : yard_(yard), stood_(stood) {}
  bool next(packed::WalkTask& task, std::size_t& id) override {
    if (at_ == stood_.size()) return false;
    id = at_++;
    task = {&stood_[id], yard_.parameters.data()};
    return true;
  }
  void done(std::size_t, const packed::WalkEnd& end) override { ticks += end.ticks; }

  std::uint64_t ticks{0};

 private:
  const bench::Yard& yard_;
  const std::vector<packed::Stood>& stood_;
  std::size_t at_{0};
};

struct Speeds {
  std::vector<double> walk;  // simulated seconds a second
  std::vector<double> stand;
};

double median(std::vector<double> values) {
  std::sort(values.begin(), values.end());
  return values[values.size() / 2];
}

void measure(const bench::Yard& yard, packed::Walker& walker, std::size_t walks, std::uint64_t seed,
             Speeds& speeds) {
  const double period = yard.setting->for_lanes()->period_s;
  Stands stands(yard, walks, seed);
  const double began = thread_s();
  walker.stand_up(stands);
  const double stood = thread_s();
  Walks desk(yard, stands.stood);
  walker.walk(desk);
  const double over = thread_s();
  speeds.stand.push_back(static_cast<double>(stands.ticks) * period / (stood - began));
  speeds.walk.push_back(static_cast<double>(desk.ticks) * period / (over - stood));
}

void tell(const std::string& robot, packed::InstructionSet set, const Speeds& speeds) {
  const double walk = median(speeds.walk);
  const auto [least, most] = std::minmax_element(speeds.walk.begin(), speeds.walk.end());
  const std::string name =
      robot + ", " + std::string(packed::name_of(set)) + ": simulated seconds a second and core";
  const std::string value =
      fmt::format("{:.0f} ({:.0f} to {:.0f}; {:.4f} us a robot's tick)", walk, *least, *most, 1e3 / walk);
  const double bar = set == packed::InstructionSet::avx512 ? 10000 : 5000;
  const bool promised =
      robot == "dunlin12" && (set == packed::InstructionSet::avx512 || set == packed::InstructionSet::avx2);
  if (promised) bench::promise(name, value, fmt::format(">= {:.0f}", bar), walk >= bar);
  if (!promised) bench::printed(name, value);
  bench::printed(robot + ", " + std::string(packed::name_of(set)) + ": the same while rising and standing",
                 fmt::format("{:.0f}", median(speeds.stand)));
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"Speed of walks by lanes"};
  std::string only;
  std::size_t walks = 512;
  int rounds = 7;
  std::uint64_t seed = 20261;
  bool quick = false;
  app.add_option("--robot", only, "dunlin12 or dunlin8 alone");
  app.add_option("--walks", walks, "in each round");
  app.add_option("--rounds", rounds, "the median counts");
  app.add_option("--seed", seed, "of sites and walks");
  app.add_flag("--quick", quick, "one small round");
  CLI11_PARSE(app, argc, argv);
  if (quick) {
    walks = 64;
    rounds = 1;
  }
  pin_here();
  for (const char* robot : {"dunlin12", "dunlin8"}) {
    if (!only.empty() && only != robot) continue;
    const bench::Yard yard(robot);
    std::map<packed::InstructionSet, Speeds> speeds;
    std::map<packed::InstructionSet, std::unique_ptr<packed::Walker>> walkers;
    for (const auto set : packed::sets_here()) {
      walkers[set] = packed::make_walker(yard.setting->for_lanes(), set);
    }
    for (int round = 0; round < rounds; ++round) {
      for (auto& [set, walker] : walkers) measure(yard, *walker, walks, seed, speeds[set]);
    }
    for (const auto& [set, made] : speeds) tell(robot, set, made);
  }
  return 0;
}
