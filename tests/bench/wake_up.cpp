// Wake-up latency of the cycle thread at wall pace against cyclictest's, interleaved: how late after its due
// time the sleep returns. Both sleep to absolute times and leave out ticks whose time has passed. The sleeps
// of the real cycle thread are seen by standing in for clock_nanosleep.
#include <dlfcn.h>
#include <fmt/format.h>
#include <time.h>

#include <CLI/CLI.hpp>
#include <array>
#include <atomic>
#include <string>
#include <vector>

#include "runtime/session/mover.h"
#include "tests/bench/promise.h"
#include "tests/bench/rig/cyclictest.h"
#include "tests/bench/rig/robot_in_loop.h"
#include "tests/bench/rig/samples.h"

namespace pastern::bench {
namespace {

constexpr int kPriority = 80;
constexpr double kBar = 1.25;
constexpr std::size_t kMost = 100'000;

std::array<std::int64_t, kMost> late_ns;
std::atomic<std::size_t> late_count{0};
std::atomic<bool> recording{false};

void record(const timespec& due, const timespec& woke) {
  const std::size_t at = late_count.load(std::memory_order_relaxed);
  if (at >= kMost) return;
  late_ns[at] =
      (static_cast<std::int64_t>(woke.tv_sec) - due.tv_sec) * 1'000'000'000 + woke.tv_nsec - due.tv_nsec;
  late_count.store(at + 1, std::memory_order_release);
}

/// The real cycle thread with the robot standing; latencies in us. Empty with a line in `error`.
std::vector<double> stand_once(double seconds, std::string& scheduling, std::string& error) {
  const files::RobotFile robot = shipped_robot("dunlin12");
  const auto cycle = cycle_in_loop(robot, session::Pace::wall);
  const auto mover = session::make_wall_mover(*cycle, {-1, kPriority});
  scheduling = mover->scheduling();
  if (!mover->move(session::Motion::rise, 0, {}).completed) {
    error = "the robot in the loop did not rise";
    return {};
  }
  late_count = 0;
  recording = true;
  const session::MotionResult result = mover->move(session::Motion::stand, seconds, {});
  recording = false;
  if (!result.completed) {
    error = fmt::format("the robot in the loop did not stand: {}", safety::name(result.trip.cause));
    return {};
  }
  std::vector<double> late;
  for (std::size_t i = 0; i < late_count; ++i) late.push_back(static_cast<double>(late_ns[i]) * 1e-3);
  return late;
}

void append(std::vector<double>& all, const std::vector<double>& more) {
  all.insert(all.end(), more.begin(), more.end());
}

int measure(int pairs, double seconds) {
  std::vector<double> ours;
  std::vector<double> machines;
  std::string scheduling;
  std::string error;
  for (int i = 0; i < pairs && error.empty(); ++i) {
    append(machines, run_cyclictest(static_cast<int>(seconds * 1000), kPriority, error));
    if (!error.empty()) break;
    // A host that stalls for longer than the overrun limit trips the gate; that half is done again, three
    // times at most.
    std::vector<double> half;
    for (int attempt = 0; attempt < 3 && half.empty(); ++attempt) {
      error.clear();
      half = stand_once(seconds, scheduling, error);
    }
    append(ours, half);
  }
  const std::string name = "wake-up at wall pace against cyclictest, p50";
  if (!error.empty()) {
    not_measured(name, error, fmt::format("ratio <= {}", kBar));
    return 1;
  }
  const double ratio = percentile(ours, 0.5) / percentile(machines, 0.5);
  promise(name,
          fmt::format("ratio {:.2f} ({:.1f}, {:.1f} us)", ratio, percentile(ours, 0.5),
                      percentile(machines, 0.5)),
          fmt::format("ratio <= {}", kBar), ratio <= kBar);
  printed("the same, p99 (means little on a shared host)",
          fmt::format("{:.0f}, {:.0f} us", percentile(ours, 0.99), percentile(machines, 0.99)));
  printed("wake-ups, cycle and cyclictest",
          fmt::format("{}, {} in {} pairs", ours.size(), machines.size(), pairs));
  printed("scheduling", scheduling);
  return 0;
}

}  // namespace
}  // namespace pastern::bench

/// Stands in for the C library's: passes on, and notes how late an absolute sleep returned.
extern "C" int clock_nanosleep(clockid_t clock, int flags, const timespec* until, timespec* left) {
  using pastern::bench::recording;
  static const auto real = reinterpret_cast<decltype(&clock_nanosleep)>(dlsym(RTLD_NEXT, "clock_nanosleep"));
  const int status = real(clock, flags, until, left);
  if (flags == TIMER_ABSTIME && recording.load(std::memory_order_relaxed)) {
    timespec woke{};
    clock_gettime(clock, &woke);
    pastern::bench::record(*until, woke);
  }
  return status;
}

int main(int argc, char** argv) {
  int pairs = 16;
  double seconds = 2.0;
  std::uint64_t seed = 0;
  CLI::App app{"Wake-up latency of the cycle thread against cyclictest's"};
  app.add_option("--pairs", pairs, "interleaved pairs")->check(CLI::Range(1, 60));
  app.add_option("--seconds", seconds, "of each half of a pair")->check(CLI::Range(0.5, 30.0));
  app.add_option("--seed", seed, "not used: nothing here is random");
  CLI11_PARSE(app, argc, argv);
  return pastern::bench::measure(pairs, seconds);
}
