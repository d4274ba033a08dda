// The tick's own work: time, instructions, allocations, locks and system calls of Cycle::tick from read to
// write and what follows it, the plug-in's own time taken out. The plug-in loops recorded frames
// (rig/looped_hal.c).
#include <fmt/format.h>
#include <pthread.h>
#include <sched.h>
#include <sys/mman.h>
#include <sys/syscall.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <atomic>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <string>
#include <vector>

#include "runtime/session/mover.h"
#include "tests/bench/promise.h"
#include "tests/bench/rig/calls.h"
#include "tests/bench/rig/counting.h"
#include "tests/bench/rig/robot_in_loop.h"
#include "tests/bench/rig/samples.h"

namespace pastern::bench {
namespace {

constexpr double kWalk_s = 5.0;
constexpr double kBar_us = 10.0;
constexpr int kTripped = 2;  // exit status of the traced child

struct Options {
  int walks{2};
  bool accept{false};           // write the number of instructions down as the new last one
  std::string instructions_of;  // child under callgrind: robot to walk once, nothing else
};

std::int64_t now_ns() {
  timespec now{};
  clock_gettime(CLOCK_MONOTONIC, &now);
  return static_cast<std::int64_t>(now.tv_sec) * 1'000'000'000 + now.tv_nsec;
}

void sleep_until(std::int64_t due) {
  const timespec at{static_cast<time_t>(due / 1'000'000'000), static_cast<long>(due % 1'000'000'000)};
  (void)clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &at, nullptr);
}

bool stand_up(session::Cycle& cycle) {
  cycle.begin(session::Motion::rise, 0);
  while (!cycle.done()) cycle.tick({now_ns()});  // no sleep: the time between ticks is of no matter here
  if (cycle.result().completed) return true;
  fmt::print(stderr, "the robot in the loop did not rise: {}\n", safety::name(cycle.gate().trip().cause));
  return false;
}

/// The ticks of one walk and nothing else; callgrind collects inside this function only.
__attribute__((noinline)) int walk_ticks(session::Cycle& cycle) {
  int ticks = 0;
  while (!cycle.done()) {
    cycle.tick({0});
    ++ticks;
  }
  return ticks;
}

bool walked_whole(session::Cycle& cycle) {
  if (cycle.result().completed) return true;
  fmt::print(stderr, "the robot in the loop did not walk to the end: {}\n",
             safety::name(cycle.result().trip.cause));
  return false;
}

/// Times of ticks with the plug-in's taken out, us. With sleeps: a tick a millisecond, as on the robot, with
/// what the caches have forgotten meanwhile.
std::vector<double> time_ticks(session::Cycle& cycle, int walks, bool with_sleeps) {
  std::vector<double> own;
  own.reserve(static_cast<std::size_t>(walks) * 6000);
  std::int64_t due = now_ns();
  for (int w = 0; w < walks; ++w) {
    cycle.begin(session::Motion::walk, kWalk_s);
    while (!cycle.done()) {
      if (with_sleeps) {
        due += 1'000'000;
        if (due < now_ns()) due = now_ns();
        sleep_until(due);
      }
      const std::int64_t began = now_ns();
      cycle.tick({began});
      const std::int64_t ended = now_ns();
      const looped_times& plugin = plugin_times();
      const std::int64_t aside =
          plugin.read_ended - plugin.read_began + plugin.write_ended - plugin.write_began;
      own.push_back(static_cast<double>(ended - began - aside) * 1e-3);
    }
    if (!walked_whole(cycle)) return {};
  }
  return own;
}

bool real_time() {
  sched_param priority{};
  priority.sched_priority = 80;
  return mlockall(MCL_CURRENT | MCL_FUTURE) == 0 &&
         pthread_setschedparam(pthread_self(), SCHED_FIFO, &priority) == 0;
}

void measure_time(const std::string& name, const Options& options) {
  const files::RobotFile robot = shipped_robot(name);
  const auto cycle = cycle_in_loop(robot, session::Pace::wall);
  if (!stand_up(*cycle)) std::exit(1);
  const std::vector<double> tight = time_ticks(*cycle, options.walks, false);
  if (!stand_up(*cycle)) std::exit(1);
  const std::vector<double> paced = time_ticks(*cycle, options.walks, true);
  const double p50 = percentile(paced, 0.5);
  promise(fmt::format("tick's own work, {}, p50", name), fmt::format("{:.1f} us", p50),
          fmt::format("<= {:.0f} us", kBar_us), !paced.empty() && p50 <= kBar_us);
  printed(fmt::format("the same, {}: p99; p50 and p99 without sleep", name),
          fmt::format("{:.1f}; {:.1f}, {:.1f} us", percentile(paced, 0.99), percentile(tight, 0.5),
                      percentile(tight, 0.99)));
}

// What the cycle thread counts about itself, through the plug-in's hook.
enum class Counting : int { not_yet, begin, counting, end, ended };
std::atomic<Counting> counting{Counting::not_yet};
Counts counted;

void count_in_cycle_thread() {
  if (counting == Counting::begin) {
    counting = Counting::counting;
    count_from_here();
  } else if (counting == Counting::end) {
    counted = count_until_here();
    counting = Counting::ended;
  }
}

/// The counters must be able to count: a bench that sees nothing proves nothing.
bool counters_work() {
  count_from_here();
  const std::string seen(1000, 'x');
  asm volatile("" : : "r"(seen.data()) : "memory");
  pthread_mutex_t mutex = PTHREAD_MUTEX_INITIALIZER;
  (void)pthread_mutex_lock(&mutex);
  const Counts counts = count_until_here();
  (void)pthread_mutex_unlock(&mutex);
  return counts.allocations == 1 && counts.locks == 1;
}

/// The real cycle thread at wall pace: walks and what lies between, sleep and queues included.
void measure_counts(const std::string& name, const Options& options) {
  const files::RobotFile robot = shipped_robot(name);
  const auto cycle = cycle_in_loop(robot, session::Pace::wall, true);
  counting = Counting::not_yet;
  set_plugin_hook(count_in_cycle_thread);
  const auto mover = session::make_wall_mover(*cycle, {});
  bool completed = mover->move(session::Motion::rise, 0, {}).completed;
  const std::uint64_t before = mover->report().ticks;
  counting = Counting::begin;
  for (int w = 0; w < options.walks && completed; ++w) {
    completed = mover->move(session::Motion::walk, kWalk_s, {}).completed &&
                mover->move(session::Motion::settle, 0, {}).completed;
  }
  counting = Counting::end;
  (void)mover->move(session::Motion::lower, 0, {});
  const std::uint64_t ticks = mover->report().ticks - before;
  std::string why;
  if (!completed) why = std::string("the robot tripped: ") + safety::name(cycle->result().trip.cause);
  if (!counters_work()) why = "the counters do not count";
  if (counting != Counting::ended || ticks <= 1000) why = "the cycle thread was not seen to count its walks";
  const auto say = [&](const std::string& what, std::uint64_t count) {
    const std::string line = fmt::format("{} in {} ticks of the cycle thread, {}", what, ticks, name);
    if (!why.empty()) return not_measured(line, why, "0");
    promise(line, fmt::format("{}", count), "0", count == 0);
  };
  say("allocations", counted.allocations);
  say("locks", counted.locks);
}

int other_thread() {
  const auto self = static_cast<int>(syscall(SYS_gettid));
  for (const auto& entry : std::filesystem::directory_iterator("/proc/self/task")) {
    const int thread = std::stoi(entry.path().filename().string());
    if (thread != self) return thread;
  }
  return 0;
}

/// In the child: the real cycle thread at wall pace, one walk between two marks.
void walk_at_wall_pace(const std::string& name) {
  const files::RobotFile robot = shipped_robot(name);
  const auto cycle = cycle_in_loop(robot, session::Pace::wall, true);
  const auto mover = session::make_wall_mover(*cycle, {});
  const int thread = other_thread();
  session::MotionResult result = mover->move(session::Motion::rise, 0, {});
  if (result.completed) {
    mark_begin(thread);
    result = mover->move(session::Motion::walk, kWalk_s, {});
    mark_end();
  }
  if (!result.completed) fmt::print(stderr, "traced: tripped by {}\n", safety::name(result.trip.cause));
  _exit(result.completed ? 0 : kTripped);
}

void measure_calls(const std::string& name) {
  std::string error;
  const Watched watched = watch_calls([&name] { walk_at_wall_pace(name); }, error);
  long sleeps = 0;
  long others = 0;
  std::string list;
  for (const auto& [number, count] : watched.calls) {
    const bool sleep_or_clock = number == SYS_clock_nanosleep || number == SYS_clock_gettime;
    (sleep_or_clock ? sleeps : others) += count;
    list += fmt::format("{}{} {}", list.empty() ? "" : ", ", call_name(number), count);
  }
  const std::string line = fmt::format("system calls of the cycle in a walk of {:.0f} s, {}", kWalk_s, name);
  const std::string bar = "only sleep and clock";
  if (error.empty() && sleeps <= 1000) error = fmt::format("only {} sleeps were seen", sleeps);
  if (!error.empty()) return not_measured(line, error, bar);
  promise(line, list, bar, others == 0);
}

// Instructions
// -------------------------------------------------------------------------------------------------

std::string instructions_file() { return std::string(PASTERN_SOURCE_DIR) + "/tests/bench/instructions.txt"; }

/// Line "NAME NUMBER"; 0 when there is none.
double last_instructions(const std::string& name) {
  std::ifstream file(instructions_file());
  std::string word;
  double number = 0;
  while (file >> word >> number) {
    if (word == name) return number;
  }
  return 0;
}

/// Under callgrind: one walk, stepped; the number of its ticks on stdout.
int walk_under_callgrind(const std::string& name) {
  const files::RobotFile robot = shipped_robot(name);
  const auto cycle = cycle_in_loop(robot, session::Pace::stepped);
  if (!stand_up(*cycle)) return 1;
  cycle->begin(session::Motion::walk, 1.0);
  fmt::print("{}\n", walk_ticks(*cycle));
  return walked_whole(*cycle) ? 0 : 1;
}

/// The number after "key" in a text file, or 0.
double number_after(const std::string& path, const std::string& key) {
  std::ifstream file(path);
  std::string line;
  while (std::getline(file, line)) {
    if (line.rfind(key, 0) == 0) return std::strtod(line.c_str() + key.size(), nullptr);
  }
  return 0;
}

/// Instructions a tick by callgrind; 0 when it could not run. The C library's own choice of code by processor
/// is switched off, so that the number does not depend on the machine.
double count_instructions(const std::string& name, const std::string& self) {
  const std::string folder =
      std::filesystem::temp_directory_path() / fmt::format("pastern_callgrind_{}", getpid());
  std::filesystem::create_directories(folder);
  const std::string command = fmt::format(
      "GLIBC_TUNABLES=glibc.cpu.hwcaps=-AVX,-AVX2,-FMA,-FMA4,-AVX512F,-AVX512VL,-AVX512BW "
      "valgrind --tool=callgrind --callgrind-out-file={0}/out --collect-atstart=no "
      "'--toggle-collect=*walk_ticks*' '--toggle-collect=looped_read' '--toggle-collect=looped_write' "
      "{1} --instructions-of {2} >{0}/ticks 2>{0}/log",
      folder, self, name);
  const int status = std::system(command.c_str());  // NOLINT(cert-env33-c): a fixed command of a bench
  const double ticks = number_after(folder + "/ticks", "");
  const double sum = number_after(folder + "/out", "summary: ");
  if (status == 0) std::filesystem::remove_all(folder);
  return status == 0 && ticks > 0 ? sum / ticks : 0;
}

void measure_instructions(const std::vector<std::string>& names, const Options& options,
                          const std::string& self) {
  std::string accepted;
  for (const std::string& name : names) {
    const double now = count_instructions(name, self);
    const double last = last_instructions(name);
    const std::string line = fmt::format("instructions a tick by callgrind, {}", name);
    const std::string bar = last > 0 ? fmt::format("<= {:.0f}, the last time", last) : "no last time";
    if (now > 0) {
      promise(line, fmt::format("{:.0f}", now), bar, last > 0 && std::round(now) <= last);
    } else {
      not_measured(line, "callgrind did not run", bar);
    }
    accepted += fmt::format("{} {:.0f}\n", name, now);
  }
  if (options.accept) std::ofstream(instructions_file()) << accepted;
}

}  // namespace
}  // namespace pastern::bench

int main(int argc, char** argv) {
  using namespace pastern::bench;
  Options options;
  std::uint64_t seed = 0;
  CLI::App app{"The tick's own work: time, instructions, allocations, locks, system calls"};
  app.add_option("--walks", options.walks, "walks of 5 s a measurement")->check(CLI::Range(1, 20));
  app.add_option("--seed", seed, "not used: nothing here is random");
  app.add_flag("--accept", options.accept, "write the instructions down as the last time's");
  app.add_option("--instructions-of", options.instructions_of, "for callgrind: walk this robot once");
  CLI11_PARSE(app, argc, argv);
  if (!options.instructions_of.empty()) return walk_under_callgrind(options.instructions_of);

  const std::vector<std::string> names{"dunlin12", "dunlin8"};
  for (const auto& name : names) measure_calls(name);  // first: it forks, and there are no threads yet
  for (const auto& name : names) measure_counts(name, options);
  const std::string self = std::filesystem::read_symlink("/proc/self/exe");
  measure_instructions(names, options, self);
  if (!real_time()) printed("scheduling", "SCHED_FIFO refused: times are those of an ordinary thread");
  for (const auto& name : names) measure_time(name, options);
  return 0;
}
