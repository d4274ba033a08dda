// Every field of every text file kind, damaged in every way: never accepted out of range, never silent.
#include <gtest/gtest.h>

#include <filesystem>
#include <functional>
#include <set>
#include <string>
#include <vector>

#include "proto/files/plan_file.h"
#include "proto/files/robot_file.h"
#include "proto/files/scenario_file.h"
#include "tests/proto/damage.h"
#include "tests/proto/fixture.h"

namespace pastern {
namespace {

using Reader = std::function<bool(const std::string& text, files::Defects& defects)>;

void damage_and_read(const std::string& text, const google::protobuf::Descriptor& message,
                     const Reader& reader) {
  files::Defects none;
  ASSERT_TRUE(reader(text, none)) << files::lines(none);
  std::set<std::string> covered;
  int refused = 0;
  for (const damage::Damaged& damaged : damage::damage_every_field(text, message, covered)) {
    files::Defects defects;
    const bool accepted = reader(damaged.text, defects);
    EXPECT_FALSE(accepted && damaged.must_refuse) << damaged.what;
    EXPECT_NE(accepted, !defects.empty()) << damaged.what;
    for (const files::Defect& defect : defects) {
      EXPECT_EQ(defect.line().find('\n'), std::string::npos) << damaged.what;
      EXPECT_FALSE(defect.expected.empty()) << damaged.what;
    }
    refused += accepted ? 0 : 1;
  }
  EXPECT_GT(refused, 100);
  // joint_damping_ratio and its absolute twin exclude one another, so that a sound file has only one of them.
  std::set<std::string> missing = damage::all_fields(message);
  for (const std::string& name : covered) missing.erase(name);
  missing.erase("pastern.v1.Scenario.joint_damping_nm_s_per_rad");
  missing.erase("pastern.v1.Adaptation.repeats");
  EXPECT_TRUE(missing.empty()) << *missing.begin() << " is in no damaged file";
}

bool read_robot_text(const std::string& text, files::Defects& defects) {
  return files::parse_robot(text, "damaged.robot.txtpb", defects).has_value();
}
bool read_scenario_text(const std::string& text, files::Defects& defects) {
  return files::parse_scenario(text, "damaged.scenario.txtpb", fixture::robot_file(), defects).has_value();
}
bool read_plan_text(const std::string& text, files::Defects& defects) {
  return files::parse_plan(text, "damaged.plan.txtpb", defects).has_value();
}

TEST(EveryField, OfARobotFileDamagedIsNeverAcceptedOutOfRange) {
  damage_and_read(fixture::text(fixture::robot()), *v1::Robot::descriptor(), read_robot_text);
}

TEST(EveryField, OfAScenarioFileDamagedIsNeverAcceptedOutOfRange) {
  damage_and_read(fixture::text(fixture::scenario()), *v1::Scenario::descriptor(), read_scenario_text);
  v1::Scenario other = fixture::scenario();
  other.clear_joint_damping_ratio();
  other.set_joint_damping_nm_s_per_rad(0.4);
  files::Defects defects;
  EXPECT_TRUE(read_scenario_text(fixture::text(other), defects)) << files::lines(defects);
}

TEST(EveryField, OfAPlanFileDamagedIsNeverAcceptedOutOfRange) {
  damage_and_read(fixture::text(fixture::plan()), *v1::Plan::descriptor(), read_plan_text);
}

// Files of one kind that are shipped.
std::vector<std::string> shipped(const std::string& folder, const std::string& suffix) {
  std::vector<std::string> paths;
  const auto root = std::filesystem::path(PASTERN_SOURCE_DIR) / folder;
  for (const auto& entry : std::filesystem::directory_iterator(root)) {
    if (entry.path().string().ends_with(suffix)) paths.push_back(entry.path().string());
  }
  return paths;
}

TEST(ShippedFiles, AreSound) {
  files::Defects defects;
  const auto robots = shipped("hal_stub/robots", ".robot.txtpb");
  const auto scenarios = shipped("hal_stub/scenarios", ".scenario.txtpb");
  const auto plans = shipped("tools/plans", ".plan.txtpb");
  EXPECT_GE(robots.size(), 2U);
  EXPECT_GE(scenarios.size(), 5U);
  EXPECT_GE(plans.size(), 1U);
  for (const std::string& path : robots) {
    const auto robot = files::read_robot(path, defects);
    ASSERT_TRUE(robot) << files::lines(defects);
    for (const std::string& scenario : scenarios) {
      EXPECT_TRUE(files::read_scenario(scenario, *robot, defects)) << files::lines(defects);
    }
  }
  for (const std::string& path : plans) EXPECT_TRUE(files::read_plan(path, defects)) << files::lines(defects);
}

}  // namespace
}  // namespace pastern
