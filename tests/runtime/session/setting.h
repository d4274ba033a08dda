// Robot, policy, plan and puppet for the tests of session and onboard.
#pragma once

#include <gtest/gtest.h>

#include <cstdlib>
#include <filesystem>
#include <string>

#include "proto/files/policy_file.h"
#include "runtime/session/in_process.h"
#include "tests/runtime/support/robots.h"

namespace pastern::test {

/// A folder of this test's own, removed with it.
class TestFolder {
 public:
  TestFolder() {
    const bool memory = std::filesystem::is_directory("/dev/shm");
    std::string pattern = std::string(memory ? "/dev/shm" : "/tmp") + "/pastern-test-XXXXXX";
    if (mkdtemp(pattern.data()) == nullptr) std::abort();
    path_ = pattern;
  }
  ~TestFolder() {
    std::error_code ignored;
    std::filesystem::remove_all(path_, ignored);
  }
  TestFolder(const TestFolder&) = delete;
  TestFolder& operator=(const TestFolder&) = delete;
  [[nodiscard]] const std::string& path() const { return path_; }

 private:
  std::string path_;
};

/// As a policy file: what the robot has no joint for is zero, one group of all parameters.
inline files::PolicyFile policy_file(const files::RobotFile& robot, v1::Policy policy) {
  for (int l = 0; l < policy.legs_size(); ++l) {
    if (robot.robot().legs(l).abduction().empty()) policy.mutable_legs(l)->set_abduction_rad(0);
  }
  policy.clear_groups();
  v1::ParameterGroup& group = *policy.add_groups();
  group.set_name("all");
  group.set_count(static_cast<std::uint32_t>(policy.parameters_size()));
  group.set_perturbation_scale(0.02);
  files::Defects defects;
  auto file = files::parse_policy(files::pack_policy(policy), "test policy", robot, defects);
  if (!file) {
    ADD_FAILURE() << files::lines(defects);
    std::abort();
  }
  return *file;
}

/// A trot that walks the puppet at about half its speed cap.
inline files::PolicyFile trot_file(const files::RobotFile& robot) {
  return policy_file(robot, trot_policy(robot.robot(), 0.15, 0.02));
}

/// "start=..." with the robot's lying pose, and more options behind it.
inline std::string puppet_options(const v1::Robot& robot, const std::string& more = "") {
  std::string text = "start=";
  for (const v1::Joint& joint : robot.joints()) text += std::to_string(joint.lying_rad()) + ",";
  return text + (more.empty() ? "" : ";" + more);
}

inline std::string puppet_path() { return PUPPET_PATH; }
inline std::string real_puppet_path() { return REAL_PUPPET_PATH; }

inline v1::Plan short_plan(v1::Adaptation::Kind kind = v1::Adaptation::ES_GRADIENT) {
  v1::Plan plan;
  plan.set_name("short");
  plan.mutable_adaptation()->set_kind(kind);
  plan.mutable_adaptation()->set_batch(2);
  plan.set_seed(7);
  plan.set_walk_s(0.6);
  plan.set_baseline_walks(2);
  plan.set_search_walks(8);
  plan.set_confirmation_pairs(5);
  plan.set_confirmation_level(0.05);
  plan.set_max_falls(5);
  plan.set_max_minutes(60);
  plan.set_max_void_repeats(3);
  plan.set_go_by(v1::Plan::AUTO);
  return plan;
}

inline std::unique_ptr<hal::Drives> puppet(const files::RobotFile& robot, const std::string& more = "",
                                           session::Pace pace = session::Pace::stepped) {
  std::string error;
  auto drives = hal::Drives::open(
      session::drives_config(robot, puppet_path(), puppet_options(robot.robot(), more), 1, pace), error);
  if (!drives) {
    ADD_FAILURE() << error;
    std::abort();
  }
  return drives;
}

}  // namespace pastern::test
