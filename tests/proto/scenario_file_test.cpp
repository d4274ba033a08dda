// A scenario against its robot.
#include "proto/files/scenario_file.h"

#include <gtest/gtest.h>

#include <functional>

#include "tests/proto/fixture.h"

namespace pastern::files {
namespace {

std::string why(const std::function<void(v1::Scenario&)>& change) {
  v1::Scenario scenario = fixture::scenario();
  change(scenario);
  Defects defects;
  return parse_scenario(fixture::text(scenario), "s", fixture::robot_file(), defects) ? "accepted"
                                                                                      : lines(defects);
}

TEST(ScenarioFile, ANameAloneIsTheNominalSite) {
  Defects defects;
  EXPECT_TRUE(parse_scenario("name: \"good_day\"", "s", fixture::robot_file(), defects)) << lines(defects);
}

TEST(ScenarioFile, RefusesJointsThatTheRobotDoesNotHave) {
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_wear(0)->set_joint("wing"); }),
            "s: wear[0].joint: found wing, expected a joint of fixture10\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_faults(0)->set_joint("wing"); }),
            "s: faults[0].joint: found wing, expected a joint of fixture10\n");
}

TEST(ScenarioFile, RefusesTheSameJointWornTwice) {
  EXPECT_EQ(why([](v1::Scenario& s) { *s.add_wear() = s.wear(0); }),
            "s: wear[1].joint: found rear_left_knee, said before, expected each joint once\n");
}

TEST(ScenarioFile, AFaultNamesAJointExactlyWhenItIsOneOfAJoint) {
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_faults(0)->clear_joint(); }),
            "s: faults[0].joint: found nothing, expected the joint that fails\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_faults(0)->set_kind(v1::Fault::PACK_CUT); }),
            "s: faults[0].joint: found front_left_hip, expected nothing: PACK_CUT is no fault of a joint\n");
  EXPECT_EQ(why([](v1::Scenario& s) {
              s.mutable_faults(0)->set_kind(v1::Fault::PACK_CUT);
              s.mutable_faults(0)->clear_joint();
            }),
            "accepted");
}

TEST(ScenarioFile, RefusesWhatContradictsItself) {
  EXPECT_EQ(why([](v1::Scenario& s) { s.clear_load_kg(); }),
            "s: load_at_m: found a place without a load, expected load_kg beside it\n"
            "s: load_hangs_m: found 0.2, expected a load_kg above 0 beside it\n");
  EXPECT_EQ(
      why([](v1::Scenario& s) { s.clear_load_hangs_m(); }),
      "s: load_swing_damping: found a damping without a load that hangs, expected load_hangs_m beside it\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.clear_frames_late(); }),
            "s: frames_late_s: found a lateness without frames_late, expected frames_late beside it\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.set_joint_damping_nm_s_per_rad(1); }),
            "s: joint_damping_ratio: found joint_damping_nm_s_per_rad as well, expected one of the two\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.set_command_jitter_s(0.02); }),
            "s: command_jitter_s: found 0.02, expected at most command_delay_s, 0.01\n");
}

TEST(ScenarioFile, RangesAreOfNumbersThatThereAreInOrderAndSaidOnce) {
  const auto judged = [](const char* field, const char* joint, double low, double high) {
    return why([&](v1::Scenario& s) {
      s.clear_drawn();
      s.clear_friction();
      v1::Drawn& drawn = *s.add_drawn();
      drawn.set_field(field);
      if (*joint != 0) drawn.set_joint(joint);
      drawn.set_low(low);
      drawn.set_high(high);
    });
  };
  EXPECT_EQ(judged("friction", "", 0.2, 1.0), "accepted");
  EXPECT_EQ(judged("friction", "", 0.4, 0.4), "accepted");
  EXPECT_EQ(judged("strength", "each", 0.85, 1.05), "accepted");
  EXPECT_EQ(judged("strength", "one", 0.4, 0.9), "accepted");
  EXPECT_EQ(judged("grip", "", 0, 1),
            "s: drawn[0].field: found grip, expected a number of the scenario or of a joint's wear\n");
  EXPECT_EQ(judged("name", "", 0, 1),
            "s: drawn[0].field: found name, expected a number of the scenario or of a joint's wear\n");
  EXPECT_EQ(judged("load_at_m.w", "", 0, 1),
            "s: drawn[0].field: found load_at_m.w, expected a number of the scenario or of a joint's wear\n");
  EXPECT_EQ(judged("friction", "", 0.5, 0.4), "s: drawn[0].high: found 0.4, expected at least low, 0.5\n");
  EXPECT_EQ(judged("friction", "each", 0.4, 0.5),
            "s: drawn[0].joint: found each, expected nothing: friction is no joint's\n");
  EXPECT_EQ(judged("strength", "", 0.4, 0.5),
            "s: drawn[0].joint: found nothing, expected each, one, or a joint of fixture10\n");
  EXPECT_EQ(judged("strength", "wing", 0.4, 0.5),
            "s: drawn[0].joint: found wing, expected each, one, or a joint of fixture10\n");
  EXPECT_EQ(judged("slope_rad", "", 0, 0.1),
            "s: drawn[0].field: found slope_rad, which has a value as well, expected one of the two\n");
  EXPECT_EQ(
      judged("strength", "rear_left_knee", 0.4, 0.5),
      "s: drawn[0].field: found strength of rear_left_knee, which has a value as well, expected one of the "
      "two\n");
  EXPECT_EQ(why([](v1::Scenario& s) { *s.add_drawn() = s.drawn(0); }),
            "s: drawn[1].field: found strength, drawn before, expected each number once\n");
}

TEST(ScenarioFile, EveryEndOfARangeIsJudgedAsAValueWouldBe) {
  const auto judged = [](const char* field, double low, double high) {
    return why([&](v1::Scenario& s) {
      s.clear_drawn();
      s.clear_friction();
      s.clear_command_jitter_s();
      v1::Drawn& drawn = *s.add_drawn();
      drawn.set_field(field);
      drawn.set_low(low);
      drawn.set_high(high);
    });
  };
  EXPECT_EQ(judged("friction", 0.4, 2),
            "s: drawn: friction: found 2, expected a finite number at least 0.02 and at most 1.5\n");
  EXPECT_NE(judged("friction", -1, 1).find("s: drawn: friction: found -1"), std::string::npos);
  EXPECT_EQ(judged("command_jitter_s", 0, 0.02),
            "s: drawn: command_jitter_s: found 0.02, expected at most command_delay_s, 0.01\n");
}

TEST(ScenarioFile, RefusesAGroundThatCannotBe) {
  EXPECT_EQ(why([](v1::Scenario& s) { s.clear_ground_wave_length_m(); }),
            "s: ground_wave_height_m: found one without the other, expected ground_wave_height_m and "
            "ground_wave_length_m\n");
  EXPECT_EQ(why([](v1::Scenario& s) {
              s.set_ground_wave_height_m(0.3);
              s.set_ground_wave_length_m(0.5);
            }),
            "s: ground_wave_height_m: found 0.3, expected at most 0.22 of the length 0.5, so that no wave is "
            "steeper than 0.7\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_ground_steps(0)->set_height_m(0); }),
            "s: ground_steps[0].height_m: found 0, expected a height other than 0 (m)\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_ground_patches(0)->set_to_m(0.5); }),
            "s: ground_patches[0].to_m: found 0.5, expected more than from_m, 1\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_ground_patches(0)->set_left_m(-2); }),
            "s: ground_patches[0].left_m: found -2, expected more than right_m, -1\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.set_friction_stick_ratio(0.9); }),
            "s: friction_stick_ratio: found 0.9, expected a finite number at least 1 and at most 3\n");
}

TEST(ScenarioFile, RefusesALoadBesideTheRobotAndAnImuOnItsSide) {
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_load_at_m()->set_y(-3); }),
            "s: load_at_m.y: found -3, expected between -2 and 2 (m)\n");
  EXPECT_EQ(why([](v1::Scenario& s) { s.mutable_imu_tilt_rad()->set_z(0.6); }),
            "s: imu_tilt_rad.z: found 0.6, expected between -0.5 and 0.5 (rad)\n");
}

}  // namespace
}  // namespace pastern::files
