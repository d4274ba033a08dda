// Walks by lanes against the same walks of one robot after another in double: returns of walks without falls
// on every scenario, and the mean return over the wide range of sites.
//   bench_packed_agrees [--walks N] [--wide N] [--seed N] [--threads N] [--robot NAME] [--quick]
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cmath>

#include "tests/bench/packed_yard.h"
#include "tests/bench/promise.h"
#include "tools/train/packed_trials.h"
#include "tools/train/pool.h"

namespace pastern {
namespace {

struct Options {
  std::size_t walks{200};
  std::size_t wide{5000};
  std::uint64_t seed{20261};
  unsigned threads{tools::all_threads()};
};

struct Pairs {
  std::vector<tools::Score> one;
  std::vector<tools::Score> lanes;
};

Pairs walk_both(const bench::Yard& yard, const tools::SiteChoice& sites, std::size_t walks,
                const Options& options) {
  std::vector<tools::Trial> trials;
  for (std::size_t i = 0; i < walks; ++i) trials.push_back({&yard.parameters, {options.seed, i}});
  return {tools::run_on(
              tools::courses_for(std::make_unique<tools::WalkCourse>(yard.setting, sites), options.threads),
              trials),
          tools::packed_trials(yard.setting, sites, options.threads)->run(trials)};
}

void agree_on(bench::Yard& yard, const std::string& scenario, const Options& options) {
  const Pairs pairs = walk_both(yard, yard.scenario(scenario), options.walks, options);
  std::vector<double> off;
  for (std::size_t i = 0; i < pairs.one.size(); ++i) {
    if (pairs.one[i].fell || pairs.lanes[i].fell) continue;
    off.push_back(std::abs(pairs.one[i].terms.total() - pairs.lanes[i].terms.total()));
  }
  if (off.empty()) return bench::printed(yard.robot_name + " on " + scenario, "no walk without a fall");
  std::sort(off.begin(), off.end());
  const double median = off[off.size() / 2];
  bench::promise(yard.robot_name + " on " + scenario + ": lanes against one robot, return, median",
                 fmt::format("{:.1e} of {} walks", median, off.size()), "<= 1e-3", median <= 1e-3);
  bench::printed(yard.robot_name + " on " + scenario + ": the same, 99 % quantile",
                 fmt::format("{:.1e}", off[off.size() * 99 / 100]));
}

double mean_of(const std::vector<tools::Score>& scores) {
  double sum = 0;
  for (const tools::Score& score : scores) sum += score.terms.total() / static_cast<double>(scores.size());
  return sum;
}

double falls_of(const std::vector<tools::Score>& scores) {
  const auto falls =
      std::count_if(scores.begin(), scores.end(), [](const auto& score) { return score.fell; });
  return 100 * static_cast<double>(falls) / static_cast<double>(scores.size());
}

void agree_widely(const bench::Yard& yard, const Options& options) {
  const Pairs pairs = walk_both(yard, tools::drawn_sites(tools::wide_ranges()), options.wide, options);
  const double one = mean_of(pairs.one);
  const double lanes = mean_of(pairs.lanes);
  const double off = 100 * std::abs(lanes - one) / std::abs(one);
  bench::promise(yard.robot_name + ": mean return over the wide range, lanes against one robot",
                 fmt::format("{:.3f} % off ({:.4f}, {:.4f}; falls {:.2f} %, {:.2f} %; {} walks)", off, lanes,
                             one, falls_of(pairs.lanes), falls_of(pairs.one), options.wide),
                 "< 0.5 %", off < 0.5);
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"Whether walks by lanes agree with those of one robot"};
  Options options;
  std::string only;
  bool quick = false;
  app.add_option("--walks", options.walks, "on each scenario");
  app.add_option("--wide", options.wide, "over the wide range");
  app.add_option("--seed", options.seed, "of sites and walks");
  app.add_option("--threads", options.threads, "threads");
  app.add_option("--robot", only, "dunlin12 or dunlin8 alone");
  app.add_flag("--quick", quick, "few walks");
  CLI11_PARSE(app, argc, argv);
  if (quick) {
    options.walks = 16;
    options.wide = 64;
  }
  for (const char* robot : {"dunlin12", "dunlin8"}) {
    if (!only.empty() && only != robot) continue;
    bench::Yard yard(robot);
    for (const char* scenario : {"cold_store", "worn_knee", "late_bus", "wet_ramp", "good_day"}) {
      agree_on(yard, scenario, options);
    }
    agree_widely(yard, options);
  }
  return 0;
}
