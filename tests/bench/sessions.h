// Sessions in process on the simulated robot, for benches: files by name, several at a time on a few threads.
#pragma once

#include <atomic>
#include <cmath>
#include <cstdint>
#include <cstdio>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <thread>
#include <vector>

#include "proto/files/plan_file.h"
#include "proto/files/policy_file.h"
#include "proto/files/robot_file.h"
#include "runtime/session/in_process.h"

namespace pastern::bench {

/// Robot, start policy and plan from the source tree, and the plug-in from the build.
struct Ground {
  std::optional<files::RobotFile> robot;
  std::optional<files::PolicyFile> start;
  std::optional<v1::Plan> plan;
  std::string scenario;

  /// False after printing what is wrong. `plan_name` as in tools/plans.
  [[nodiscard]] bool load(const std::string& robot_name, const std::string& scenario_name,
                          const std::string& plan_name) {
    const std::string source = PASTERN_SOURCE_DIR;
    files::Defects defects;
    robot = files::read_robot(source + "/hal_stub/robots/" + robot_name + ".robot.txtpb", defects);
    if (robot)
      start = files::read_policy(source + "/hal_stub/policies/" + robot_name + ".policy", *robot, defects);
    plan = files::read_plan(source + "/tools/plans/" + plan_name + ".plan.txtpb", defects);
    scenario = source + "/hal_stub/scenarios/" + scenario_name + ".scenario.txtpb";
    if (robot && start && plan) return true;
    std::fputs(files::lines(defects).c_str(), stderr);
    return false;
  }

  /// A session of this plan with this seed, for the session and for the simulated robot.
  [[nodiscard]] session::InProcess session(std::uint64_t seed) const {
    session::InProcess given;
    given.robot = &*robot;
    given.start = &*start;
    given.plan = *plan;
    given.plan.set_seed(seed);
    given.plugin = std::string(PASTERN_BINARY_DIR) + "/lib/libpastern_hal_stub.so";
    given.plugin_options = "scenario=" + scenario;
    given.plugin_seed = seed;
    return given;
  }
};

/// Calls job(0) ... job(count - 1), each once, on `threads` threads.
inline void in_parallel(std::uint64_t count, unsigned threads,
                        const std::function<void(std::uint64_t)>& job) {
  std::atomic<std::uint64_t> next{0};
  std::vector<std::thread> workers;
  for (unsigned i = 0; i < threads; ++i)
    workers.emplace_back([&] {
      for (std::uint64_t mine = next++; mine < count; mine = next++) job(mine);
    });
  for (std::thread& worker : workers) worker.join();
}

/// Upper limit of the two-sided 95 % Clopper-Pearson interval for `hits` of `trials`: the p at which so few
/// hits or fewer have probability 2.5 %, by bisection on the binomial sum.
inline double clopper_pearson_upper(std::uint64_t hits, std::uint64_t trials) {
  if (hits >= trials) return 1.0;
  const auto at_most = [&](double p) {
    double sum = 0;
    for (std::uint64_t k = 0; k <= hits; ++k) {
      const auto n = static_cast<double>(trials);
      const auto x = static_cast<double>(k);
      sum += std::exp(std::lgamma(n + 1) - std::lgamma(x + 1) - std::lgamma(n - x + 1) + x * std::log(p) +
                      (n - x) * std::log1p(-p));
    }
    return sum;
  };
  double low = 0;
  double high = 1;
  for (int i = 0; i < 60; ++i) {
    const double middle = (low + high) / 2;
    (at_most(middle) > 0.025 ? low : high) = middle;
  }
  return high;
}

}  // namespace pastern::bench
