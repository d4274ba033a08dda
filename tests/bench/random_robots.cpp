// Random robots of any valid tree under random torques, on grounds by lot: what is not a number, what wins
// energy, what stays sunk.
//   bench_random_robots [--robots N] [--seed N] [--seconds S] [--threads N] [--quick]
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <atomic>
#include <thread>
#include <vector>

#include "tests/bench/promise.h"
#include "tests/hal_stub/random_robot.h"

namespace {

using pastern::stub::Thrashed;

std::vector<Thrashed> thrash_all(std::uint64_t seed, std::size_t robots, double seconds, unsigned threads) {
  std::vector<Thrashed> seen(robots);
  std::atomic<std::size_t> next{0};
  std::vector<std::thread> workers;
  for (unsigned t = 0; t < std::max(1U, threads); ++t) {
    workers.emplace_back([&] {
      for (std::size_t i = next++; i < robots; i = next++) seen[i] = pastern::stub::thrash(seed + i, seconds);
    });
  }
  for (auto& worker : workers) worker.join();
  return seen;
}

}  // namespace

int main(int argc, char** argv) {
  CLI::App app{"Random robots under random torques"};
  std::size_t robots = 1000;
  std::uint64_t seed = 1;
  double seconds = 10;
  unsigned threads = 2;
  bool quick = false;
  app.add_option("--robots", robots, "how many");
  app.add_option("--seed", seed, "of the first");
  app.add_option("--seconds", seconds, "simulated, each");
  app.add_option("--threads", threads, "threads");
  app.add_flag("--quick", quick, "50 robots");
  CLI11_PARSE(app, argc, argv);
  if (quick) robots = 50;
  const std::vector<Thrashed> seen = thrash_all(seed, robots, seconds, threads);
  const auto count = [&](auto&& is) { return std::count_if(seen.begin(), seen.end(), is); };
  const auto refused = count([](const Thrashed& t) { return !t.refused.empty(); });
  const auto broken = count([](const Thrashed& t) { return !t.finite; });
  const auto winners = count([](const Thrashed& t) { return !(t.won_share <= 1); });
  const auto sunk = count([](const Thrashed& t) { return !(t.deep_s <= 0.05); });
  double work = 0, allowed = 0, won = 0, deep = 0, depth = 0;
  for (const Thrashed& t : seen) {
    work += t.work_j;
    allowed += t.allowed_j;
    won = std::max(won, t.won_j);
    deep = std::max(deep, t.deep_s);
    depth = std::max(depth, t.depth_ratio);
  }
  using pastern::bench::printed;
  using pastern::bench::promise;
  const std::string of = fmt::format(" of {} robots", seen.size());
  promise("random robots: valid but refused", std::to_string(refused) + of, "0", refused == 0);
  promise("random robots: not a number", std::to_string(broken) + of, "0", broken == 0);
  promise("random robots: energy beyond the work put in",
          fmt::format("{}{} (most {:.1e} J)", winners, of, won), "0 beyond the tolerance", winners == 0);
  promise("random robots: deeper than 5 x static depth for > 50 ms",
          fmt::format("{}{} (longest {:.0f} ms)", sunk, of, 1e3 * deep), "0", sunk == 0);
  printed("random robots: energy tolerance of the integrator's order, of the work",
          fmt::format("{:.1f} %", 100 * allowed / std::max(work, 1e-9)));
  printed("random robots: deepest, times the static depth", fmt::format("{:.1f}", depth));
  printed("random robots: branching; sliding",
          fmt::format("{}; {}", count([](const Thrashed& t) { return t.branches; }),
                      count([](const Thrashed& t) { return t.slides; })));
  return 0;
}
