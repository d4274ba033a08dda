// How well the shipped start policies walk: over the wide range of sites, and on the nominal site.
//   bench_start_policies [--draws N] [--seed N] [--threads N] [--quick]
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <stdexcept>

#include "proto/files/policy_file.h"
#include "tests/bench/promise.h"
#include "tools/train/pool.h"
#include "tools/train/sites.h"
#include "tools/train/trainer.h"
#include "tools/train/walk.h"

namespace pastern {
namespace {

struct Options {
  std::size_t draws{1000};
  std::uint64_t seed{20261};
  unsigned threads{tools::all_threads()};
};

std::string shipped(const std::string& name) { return std::string(PASTERN_SOURCE_DIR) + "/hal_stub/" + name; }

void judge(const std::string& name, const Options& options) {
  files::Defects defects;
  const auto robot = files::read_robot(shipped("robots/" + name + ".robot.txtpb"), defects);
  if (!robot) throw std::runtime_error(files::lines(defects));
  const auto policy = files::read_policy(shipped("policies/" + name + ".policy"), *robot, defects);
  if (!policy) throw std::runtime_error(files::lines(defects));
  std::string error;
  const auto setting = tools::WalkSetting::make(robot->robot(), policy->policy(), 5, error);
  if (!setting) throw std::runtime_error(error);
  const Parameters parameters(policy->policy().parameters().begin(), policy->policy().parameters().end());
  const auto look = [&](const tools::SiteChoice& sites, std::size_t walks) {
    return tools::look_at(
        tools::courses_for(std::make_unique<tools::WalkCourse>(setting, sites), options.threads), parameters,
        options.seed, 0, walks);
  };
  const tools::Look wide = look(tools::drawn_sites(tools::wide_ranges()), options.draws);
  bench::promise(name + " start policy, wide range: falls",
                 fmt::format("{:.2f} % of {} walks", 100 * wide.falls, wide.walks), "<= 1 %",
                 wide.falls <= 0.01);
  bench::promise(name + " start policy, wide range: mean return",
                 fmt::format("{:.3f} +- {:.3f}", wide.mean_return, wide.return_error), ">= 2.9",
                 wide.mean_return >= 2.9);
  const tools::Look nominal = look(tools::one_site(stub::nominal_site(setting->model())),
                                   std::max<std::size_t>(20, options.draws / 5));
  bench::promise(name + " start policy, nominal site: return",
                 fmt::format("{:.3f} +- {:.3f}", nominal.mean_return, nominal.return_error), ">= 3.1",
                 nominal.mean_return >= 3.1);
  bench::promise(name + " start policy, nominal site: speed",
                 fmt::format("{:.3f} m/s", nominal.speed_m_per_s), ">= 0.6 m/s",
                 nominal.speed_m_per_s >= 0.6);
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"Shipped start policies over the wide range and on the nominal site"};
  Options options;
  bool quick = false;
  app.add_option("--draws", options.draws, "walks over the wide range");
  app.add_option("--seed", options.seed, "seed of sites and walks");
  app.add_option("--threads", options.threads, "threads");
  app.add_flag("--quick", quick, "100 walks");
  CLI11_PARSE(app, argc, argv);
  if (quick) options.draws = 100;
  for (const char* name : {"dunlin12", "dunlin8"}) judge(name, options);
  return 0;
}
