// One encoder of a simulated robot that is stuck, from any moment of the whole course from parked to parked:
// the gate names its joint. And no encoder of a sound robot is taken for stuck, also when its steps are
// coarse.
#include <google/protobuf/text_format.h>
#include <gtest/gtest.h>

#include <fstream>
#include <utility>

#include "runtime/session/blend.h"
#include "tests/runtime/session/setting.h"

namespace pastern::session {
namespace {

constexpr double kWalk_s = 2.0;
const std::string kFolder = std::string(PASTERN_SOURCE_DIR) + "/hal_stub/";

void write(const std::string& path, const std::string& text) {
  std::ofstream file(path);
  file << text;
  ASSERT_TRUE(file.good());
}

class StuckEncoder : public testing::TestWithParam<const char*> {
 protected:
  /// The first trip on the way from parked to parked; cause none without.
  safety::Trip course(const files::RobotFile& robot, const std::string& faults) {
    const std::string scenario = folder_.path() + "/site.scenario.txtpb";
    write(scenario, "name: \"site\"\n" + faults);
    files::Defects defects;
    const auto policy = files::read_policy(kFolder + "policies/" + GetParam() + ".policy", robot, defects);
    std::string error;
    auto drives =
        hal::Drives::open(drives_config(robot, STUB_PATH, "scenario=" + scenario, 7, Pace::stepped), error);
    EXPECT_TRUE(policy && drives) << files::lines(defects) << error;
    if (!policy || !drives) std::abort();
    Cycle cycle(robot.robot(), policy->policy(), std::move(drives));
    EXPECT_TRUE(cycle.drives().carry_back(3));
    cycle.set_down();
    const std::pair<Motion, double> motions[] = {{Motion::parked, kOnTheMark_s},
                                                 {Motion::rise, 0},
                                                 {Motion::stand, kStand_s},
                                                 {Motion::walk, kWalk_s},
                                                 {Motion::settle, 0},
                                                 {Motion::lower, 0},
                                                 {Motion::parked, 1}};
    for (const auto& [motion, duration_s] : motions) {
      const MotionResult result = cycle.run(motion, duration_s);
      if (result.tripped) return result.trip;
    }
    return {};
  }

  test::TestFolder folder_;
};

TEST_P(StuckEncoder, IsFoundFromAnyMomentOnAndNamed) {
  const files::RobotFile robot = test::shipped_robot(GetParam());
  const double risen_s = kOnTheMark_s + robot.robot().rise_s();
  const double walked_s = risen_s + kStand_s + kWalk_s;
  const double moments_s[] = {0.05,                      // parked
                              kOnTheMark_s + 0.3,        // rising
                              risen_s + 0.1,             // standing
                              risen_s + kStand_s + 0.7,  // walking
                              walked_s + 0.1,            // settling
                              walked_s + robot.robot().settle_s() + 0.3};
  for (const double moment_s : moments_s) {
    for (int joint = 0; joint < robot.joint_count(); ++joint) {
      const std::string name = robot.robot().joints(joint).name();
      const safety::Trip trip =
          course(robot, "faults { kind: ANGLE_STUCK joint: \"" + name +
                            "\" begins_s: " + std::to_string(moment_s) + " lasts_s: 100 }\n");
      EXPECT_EQ(trip.cause, safety::Cause::frame_frozen) << name << " " << moment_s << " s";
      EXPECT_EQ(trip.joint, joint) << name << " " << moment_s << " s";
      EXPECT_GT(static_cast<double>(trip.time.value) * 1e-9, moment_s);
    }
  }
}

TEST_P(StuckEncoder, IsNotSeenInASoundRobotOfCoarseEncoders) {
  v1::Robot coarse = test::shipped_robot(GetParam()).robot();
  coarse.mutable_sensors()->set_encoder_step_rad(0.01);
  std::string text;
  ASSERT_TRUE(google::protobuf::TextFormat::PrintToString(coarse, &text));
  const std::string path = folder_.path() + "/coarse.robot.txtpb";
  write(path, text);
  files::Defects defects;
  const auto robot = files::read_robot(path, defects);
  ASSERT_TRUE(robot) << files::lines(defects);
  const safety::Trip trip = course(*robot, "");
  EXPECT_EQ(trip.cause, safety::Cause::none) << safety::name(trip.cause) << " of joint " << trip.joint;
}

INSTANTIATE_TEST_SUITE_P(Robots, StuckEncoder, testing::Values("dunlin12", "dunlin8"));

}  // namespace
}  // namespace pastern::session
