// What each shipped scenario leaves to gain: return of the start policy and of the best policy that training
// on that very site finds from it (the oracle), on common walks.
//   bench_site_gaps [--robot NAME] [--scenario NAME] [--seed N] [--threads N] [--quick]
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <stdexcept>

#include "proto/files/policy_file.h"
#include "proto/files/scenario_file.h"
#include "tests/bench/promise.h"
#include "tools/train/oracle.h"
#include "tools/train/pool.h"

namespace pastern {
namespace {

std::string shipped(const std::string& name) { return std::string(PASTERN_SOURCE_DIR) + "/hal_stub/" + name; }

template <class T>
const T& sound(const std::optional<T>& value, const files::Defects& defects) {
  if (!value) throw std::runtime_error(files::lines(defects));
  return *value;
}

void measure(const std::string& robot_name, const std::string& scenario_name,
             const tools::OracleSettings& settings, unsigned threads) {
  files::Defects defects;
  const auto robot_file = files::read_robot(shipped("robots/" + robot_name + ".robot.txtpb"), defects);
  const files::RobotFile& robot = sound(robot_file, defects);
  const auto policy_file = files::read_policy(shipped("policies/" + robot_name + ".policy"), robot, defects);
  const v1::Policy& policy = sound(policy_file, defects).policy();
  const auto scenario_file =
      files::read_scenario(shipped("scenarios/" + scenario_name + ".scenario.txtpb"), robot, defects);
  const v1::Scenario& scenario = sound(scenario_file, defects);
  std::string error;
  const auto setting = tools::WalkSetting::make(robot.robot(), policy, 5, error);
  if (!setting) throw std::runtime_error(error);
  const tools::WalkCourse site(setting,
                               tools::one_site(stub::site_of(scenario, setting->model(), settings.seed)));
  const Parameters start(policy.parameters().begin(), policy.parameters().end());
  const tools::Gap gap = tools::find_gap(site, start, settings, threads);
  const std::string name = robot_name + " on " + scenario_name + ": oracle less start";
  const std::string value =
      fmt::format("{:.3f} (start {:.3f} +- {:.3f}, falls {:.1f} %; oracle {:.3f} +- {:.3f}, falls {:.1f} %)",
                  gap.gain(), gap.start.mean_return, gap.start.return_error, 100 * gap.start.falls,
                  gap.oracle.mean_return, gap.oracle.return_error, 100 * gap.oracle.falls);
  if (scenario_name == "good_day" || robot_name != "dunlin12") {
    bench::printed(name, value);
  } else {
    bench::promise(name, value, ">= 0.4", gap.gain() >= 0.4);
  }
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"What each scenario leaves to gain"};
  std::string robot = "dunlin12";
  std::string only;
  unsigned threads = tools::all_threads();
  tools::OracleSettings settings;
  bool quick = false;
  app.add_option("--robot", robot, "dunlin8 or dunlin12");
  app.add_option("--scenario", only, "this one alone");
  app.add_option("--seed", settings.seed, "seed of training and judgement");
  app.add_option("--threads", threads, "threads");
  app.add_flag("--quick", quick, "start policies only, few walks");
  CLI11_PARSE(app, argc, argv);
  if (quick) {
    settings.iterations = 2;
    settings.directions = 2;
    settings.look_walks = 4;
    settings.judging_walks = 40;
  }
  for (const char* scenario : {"cold_store", "worn_knee", "late_bus", "wet_ramp", "good_day"}) {
    if (only.empty() || only == scenario) measure(robot, scenario, settings, threads);
  }
  return 0;
}
