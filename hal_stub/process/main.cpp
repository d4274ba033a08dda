// pastern-stub-robot: simulated drives and body at wall pace, in a process of their own, so that the robot
// outlives the program that drives it and its drives time out by themselves. One thread; ticks on absolute
// time, missed ticks skipped.
#include <sched.h>
#include <sys/mman.h>

#include <cmath>
#include <csignal>
#include <cstdio>
#include <ctime>
#include <string>

#include "hal_stub/plugin/settings.h"
#include "hal_stub/process/bus_server.h"
#include "hal_stub/process/options.h"
#include "hal_stub/process/trace.h"

namespace pastern::stub {
namespace {

volatile std::sig_atomic_t g_end = 0;

void end_soon(int) { g_end = 1; }

std::int64_t now_ns() {
  timespec t{};
  clock_gettime(CLOCK_MONOTONIC, &t);
  return static_cast<std::int64_t>(t.tv_sec) * 1'000'000'000 + t.tv_nsec;
}

void sleep_until(std::int64_t due) {
  const timespec t{static_cast<time_t>(due / 1'000'000'000), static_cast<long>(due % 1'000'000'000)};
  while (clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &t, nullptr) != 0 && g_end == 0) {
  }
}

/// Real drives do not wait for a busy computer: as much priority as we may have.
void ask_for_priority() {
  sched_param wanted{};
  wanted.sched_priority = 60;
  if (sched_setscheduler(0, SCHED_FIFO, &wanted) != 0) {
    std::fprintf(stderr, "pastern-stub-robot: no real-time priority; the simulated drives may be late\n");
  }
  (void)mlockall(MCL_CURRENT | MCL_FUTURE);
}

void run(SimulatedRobot& robot, BusServer& bus, Trace& trace, std::uint64_t every) {
  const auto period = static_cast<std::int64_t>(std::llround(robot.model().period_s() * 1e9));
  std::int64_t due = now_ns() + period;
  std::uint64_t skipped = 0;
  for (std::uint64_t tick = 0; g_end == 0; ++tick) {
    sleep_until(due);
    bus.take_messages();
    robot.step();
    const std::int64_t now = now_ns();
    bus.send_frame(now);
    if (tick % every == 0) trace.add(robot, now, bus.commands(), skipped);
    due += period;
    if (due <= now) {  // a stalled machine: what was missed did not happen
      const std::int64_t missed = (now - due) / period + 1;
      skipped += static_cast<std::uint64_t>(missed);
      due += missed * period;
    }
  }
}

int fail(int status, const std::string& line) {
  std::fprintf(stderr, "pastern-stub-robot: %s\n", line.c_str());
  return status;
}

int serve(const ProcessOptions& options) {
  std::string error;
  const auto robot = robot_from_files(options.robot, options.scenario, options.seed, error);
  if (!robot) return fail(3, error);
  BusServer bus(*robot);
  Trace trace;
  if (!options.trace.empty() && !trace.open(options.trace, error)) return fail(70, error);
  if (!bus.listen_at(options.socket, error)) return fail(70, error);
  struct sigaction action {};
  action.sa_handler = end_soon;
  sigaction(SIGINT, &action, nullptr);
  sigaction(SIGTERM, &action, nullptr);
  ask_for_priority();
  std::printf("ready %s\n", options.socket.c_str());
  std::fflush(stdout);
  run(*robot, bus, trace, options.every);
  return 0;
}

}  // namespace
}  // namespace pastern::stub

int main(int count, char** words) {
  pastern::stub::ProcessOptions options;
  std::string error;
  if (!pastern::stub::parse_command_line(count, words, options, error)) return pastern::stub::fail(2, error);
  if (options.help) {
    std::fputs(pastern::stub::usage(), stdout);
    return 0;
  }
  return pastern::stub::serve(options);
}
