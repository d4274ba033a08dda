// Whether a step of 1 ms is short enough: the start policies' walks over the wide range with the body stepped
// at 1 ms and at 0.125 ms, the cycle at its own rate in both. The same lots, so that chance is the same.
//   bench_step_size [--walks N] [--seed N] [--threads N] [--quick]
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <cmath>
#include <stdexcept>
#include <vector>

#include "proto/files/policy_file.h"
#include "tests/bench/promise.h"
#include "tools/train/pool.h"
#include "tools/train/sites.h"
#include "tools/train/walk.h"

namespace pastern {
namespace {

struct Options {
  std::size_t walks{5000};
  std::uint64_t seed{20262};
  unsigned threads{tools::all_threads()};
};

struct Walks {
  std::vector<double> returns;
  std::size_t falls{0};
};

Walks walked(const files::RobotFile& robot, const v1::Policy& policy, double step_s, const Options& options) {
  std::string error;
  const auto setting = tools::WalkSetting::make(robot.robot(), policy, 5, error, step_s);
  if (!setting) throw std::runtime_error(error);
  const Parameters parameters(policy.parameters().begin(), policy.parameters().end());
  std::vector<std::unique_ptr<tools::Course>> courses;
  for (unsigned t = 0; t < options.threads; ++t) {
    courses.push_back(std::make_unique<tools::WalkCourse>(setting, tools::drawn_sites(tools::wide_ranges())));
  }
  Walks made;
  std::vector<char> fell(options.walks);
  made.returns.resize(options.walks);
  tools::spread(options.threads, options.walks, [&](unsigned worker, std::size_t i) {
    const tools::Score score = courses[worker]->run(parameters, {options.seed, i});
    made.returns[i] = score.terms.total();
    fell[i] = score.fell ? 1 : 0;
  });
  for (const char f : fell) made.falls += f != 0 ? 1 : 0;
  return made;
}

void judge(const std::string& name, const Options& options) {
  const std::string root = std::string(PASTERN_SOURCE_DIR) + "/hal_stub/";
  files::Defects defects;
  const auto robot = files::read_robot(root + "robots/" + name + ".robot.txtpb", defects);
  if (!robot) throw std::runtime_error(files::lines(defects));
  const auto policy = files::read_policy(root + "policies/" + name + ".policy", *robot, defects);
  if (!policy) throw std::runtime_error(files::lines(defects));
  const Walks coarse = walked(*robot, policy->policy(), 0.001, options);
  const Walks fine = walked(*robot, policy->policy(), 0.000125, options);
  double mean = 0, off = 0, squares = 0;
  const auto n = static_cast<double>(options.walks);
  for (std::size_t i = 0; i < options.walks; ++i) {
    const double d = coarse.returns[i] - fine.returns[i];
    mean += fine.returns[i] / n;
    off += d / n;
    squares += d * d / n;
  }
  const double error = std::sqrt(std::max(0.0, squares - off * off) / n);
  const double share = std::fabs(off / mean);
  bench::promise(name + " start policy, 1 ms against 0.125 ms: mean return",
                 fmt::format("{:+.2f} % of {:.3f} (+- {:.2f} %, {} walks)", 100 * off / mean, mean,
                             100 * error / mean, options.walks),
                 "differs < 1 %", share < 0.01);
  bench::printed(name + " start policy, falls at 1 ms; at 0.125 ms",
                 fmt::format("{}; {}", coarse.falls, fine.falls));
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"The step of the body, 1 ms against an eighth of it"};
  Options options;
  bool quick = false;
  app.add_option("--walks", options.walks, "walks at each step size and robot");
  app.add_option("--seed", options.seed, "seed of sites and walks");
  app.add_option("--threads", options.threads, "threads");
  app.add_flag("--quick", quick, "100 walks");
  CLI11_PARSE(app, argc, argv);
  if (quick) options.walks = 100;
  for (const char* name : {"dunlin12", "dunlin8"}) judge(name, options);
  return 0;
}
