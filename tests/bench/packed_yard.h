// A shipped robot with its shipped policy, for benches of walks by lanes.
#pragma once

#include <stdexcept>
#include <string>
#include <vector>

#include "proto/files/policy_file.h"
#include "proto/files/robot_file.h"
#include "proto/files/scenario_file.h"
#include "tools/packed/fleet.h"
#include "tools/train/sites.h"

namespace pastern::bench {

inline std::string shipped(const std::string& name) {
  return std::string(PASTERN_SOURCE_DIR) + "/hal_stub/" + name;
}

template <class T>
const T& sound(const std::optional<T>& value, const files::Defects& defects) {
  if (!value) throw std::runtime_error(files::lines(defects));
  return *value;
}

struct Yard {
  explicit Yard(const std::string& name, double walk_s = 5) : robot_name(name) {
    const auto file = files::read_robot(shipped("robots/" + name + ".robot.txtpb"), defects);
    robot.emplace(sound(file, defects));
    const auto read = files::read_policy(shipped("policies/" + name + ".policy"), *robot, defects);
    const v1::Policy& policy = sound(read, defects).policy();
    parameters.assign(policy.parameters().begin(), policy.parameters().end());
    std::string error;
    setting = tools::WalkSetting::make(robot->robot(), policy, walk_s, error);
    if (!setting) throw std::runtime_error(error);
  }

  tools::SiteChoice scenario(const std::string& name) {
    const auto read = files::read_scenario(shipped("scenarios/" + name + ".scenario.txtpb"), *robot, defects);
    return tools::one_site(stub::site_of(sound(read, defects), setting->model(), 1));
  }

  std::string robot_name;
  files::Defects defects;
  std::optional<files::RobotFile> robot;
  Parameters parameters;
  std::shared_ptr<const tools::WalkSetting> setting;
};

}  // namespace pastern::bench
