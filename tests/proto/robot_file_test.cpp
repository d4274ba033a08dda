// What no single field of a robot file shows, each refused with its line.
#include "proto/files/robot_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>

#include "proto/files/geometry.h"
#include "safety/gate.h"
#include "tests/proto/fixture.h"

namespace pastern::files {
namespace {

using Change = std::function<void(v1::Robot&)>;

std::string why(const Change& change) {
  v1::Robot robot = fixture::robot();
  change(robot);
  Defects defects;
  return parse_robot(fixture::text(robot), "r", defects) ? "accepted" : lines(defects);
}

// Joints of the fixture: 0-2 front left (abduction, hip, knee), 3-5 front right, 6-7 rear left (hip, knee),
// 8-9 rear right.
constexpr int kAbduction = 0;
constexpr int kHip = 1;
constexpr int kKnee = 2;

struct Case {
  const char* name;
  Change change;
  const char* expected;  ///< part of the line
};

class RobotFileRefuses : public ::testing::TestWithParam<Case> {};

TEST_P(RobotFileRefuses, WithItsLine) {
  const std::string text = why(GetParam().change);
  EXPECT_NE(text.find(GetParam().expected), std::string::npos) << text;
}

const Case kTree[] = {
    {"JointNameTwice", [](v1::Robot& r) { r.mutable_joints(9)->set_name("rear_left_knee"); },
     "r: joints[9].name: found rear_left_knee, expected a name that no other joint has"},
    {"UnknownParent", [](v1::Robot& r) { r.mutable_joints(kHip)->set_parent("wing"); },
     "r: joints[1].parent: found wing, expected a joint listed before this one"},
    {"ParentAfterChild", [](v1::Robot& r) { r.mutable_joints(6)->set_parent("rear_left_knee"); },
     "r: joints[6].parent: found rear_left_knee"},
    {"ParentOfItself", [](v1::Robot& r) { r.mutable_joints(6)->set_parent("rear_left_hip"); },
     "r: joints[6].parent: found rear_left_hip"},
    {"AxisTooShort", [](v1::Robot& r) { r.mutable_joints(kKnee)->mutable_axis()->set_y(0.5); },
     "r: joints[2].axis: found length 0.5, expected a unit vector"},
    {"AxisZero", [](v1::Robot& r) { r.mutable_joints(kKnee)->mutable_axis()->set_y(0); },
     "r: joints[2].axis: found length 0, expected a unit vector"},
    {"InertiaAgainstTheTriangle",
     [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_link()->mutable_inertia()->set_zz(0.5); },
     "r: joints[1].link.inertia: found a moment of 0.5, expected each of xx, yy, zz at most the sum"},
    {"TrunkInertiaAgainstTheTriangle",
     [](v1::Robot& r) { r.mutable_trunk()->mutable_link()->mutable_inertia()->set_xx(3); },
     "r: trunk.link.inertia: found a moment of 3"},
    {"ProductsTooLarge",
     [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_link()->mutable_inertia()->set_xy(0.006); },
     "r: joints[1].link.inertia: found products xy, xz, yz too large"},
    {"FlatTrunk", [](v1::Robot& r) { r.mutable_trunk()->mutable_size_m()->set_z(0); },
     "r: trunk.size_m.z: found 0, expected a length above 0"},
};

const Case kJoint[] = {
    {"RangeTurnedRound", [](v1::Robot& r) { r.mutable_joints(kHip)->set_angle_max_rad(-1.2); },
     "r: joints[1].angle_max_rad: found -1.2"},
    {"StanceOutside", [](v1::Robot& r) { r.mutable_joints(kHip)->set_stance_rad(2.6); },
     "r: joints[1].stance_rad: found 2.6, expected above -0.95 and below 2.45"},
    {"StanceOnTheSoftEdge", [](v1::Robot& r) { r.mutable_joints(kHip)->set_stance_rad(2.46); },
     "r: joints[1].stance_rad: found 2.46"},
    {"LyingOutside", [](v1::Robot& r) { r.mutable_joints(kKnee)->set_lying_rad(-2.69); },
     "r: joints[2].lying_rad: found -2.69"},
    {"SoftEdgeWiderThanTheRange",
     [](v1::Robot& r) { r.mutable_joints(kAbduction)->mutable_guard()->set_soft_edge_rad(0.7); },
     "r: joints[0].angle_max_rad: found 0.6"},
    {"RatedAbovePeak", [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_drive()->set_rated_torque_nm(31); },
     "r: joints[1].drive.rated_torque_nm: found 31, expected at most drive.peak_torque_nm"},
    {"CurrentLimitBelowRated",
     [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_drive()->set_current_limit_a(9); },
     "r: joints[1].drive.current_limit_a: found 9, expected enough for rated_torque_nm, 13.3"},
    {"DeratesFromHotToWarm",
     [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_drive()->set_derate_warm_c(131); },
     "r: joints[1].drive.derate_hot_c: found 130, expected more than derate_warm_c, 131 (deg C)"},
    {"DeratesToNowhere", [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_drive()->clear_derate_hot_c(); },
     "r: joints[1].drive.derate_warm_c: found one without the other, expected derate_warm_c and "
     "derate_hot_c"},
    {"GuardAboveDrive", [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_guard()->set_peak_torque_nm(35); },
     "r: joints[1].guard.peak_torque_nm: found 35, expected at most drive.peak_torque_nm, 30"},
    {"TripBelowPeak", [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_guard()->set_trip_torque_nm(27); },
     "r: joints[1].guard.trip_torque_nm: found 27, expected at least guard.peak_torque_nm, 28"},
    {"SoftSpeedNotBelowHard",
     [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_guard()->set_soft_speed_rad_per_s(25); },
     "r: joints[1].guard.soft_speed_rad_per_s: found 25, expected below guard.speed_max_rad_per_s, 25"},
    {"WarmNotBelowMax",
     [](v1::Robot& r) { r.mutable_joints(kHip)->mutable_guard()->set_winding_warm_c(120); },
     "r: joints[1].guard.winding_warm_c: found 120, expected below guard.winding_max_c, 120"},
    {"NoStiffness", [](v1::Robot& r) { r.mutable_joints(kHip)->set_stiffness_nm_per_rad(0); },
     "r: joints[1].stiffness_nm_per_rad: found 0"},
};

const Case kLeg[] = {
    {"LegNameTwice", [](v1::Robot& r) { r.mutable_legs(3)->set_name("rear_left"); },
     "r: legs[3].name: found rear_left, expected a name that no other leg has"},
    {"UnknownHip", [](v1::Robot& r) { r.mutable_legs(0)->set_hip("wing"); },
     "r: legs[0].hip: found wing, expected the name of a joint"},
    {"UnknownAbduction", [](v1::Robot& r) { r.mutable_legs(0)->set_abduction("wing"); },
     "r: legs[0].abduction: found wing, expected the name of a joint"},
    {"JointInTwoLegs", [](v1::Robot& r) { r.mutable_legs(3)->set_hip("rear_left_hip"); },
     "r: legs[3].hip: found rear_left_hip, used before"},
    {"HipAlsoTheKnee", [](v1::Robot& r) { r.mutable_legs(3)->set_knee("rear_right_hip"); },
     "r: legs[3].knee: found rear_right_hip, used before"},
    {"NoHinge", [](v1::Robot& r) { r.mutable_joints(kKnee)->set_kind(v1::Joint::PRISMATIC); },
     "r: legs[0].knee: found front_left_knee, not a hinge"},
    {"KneeNotOnItsHip", [](v1::Robot& r) { r.mutable_joints(9)->set_parent("rear_left_hip"); },
     "r: legs[3].knee: found rear_right_knee carried by rear_left_hip, expected a joint carried by "
     "rear_right_hip"},
    {"HipNotOnItsAbduction", [](v1::Robot& r) { r.mutable_joints(kHip)->clear_parent(); },
     "r: legs[0].hip: found front_left_hip carried by the trunk"},
    {"KneeAcross",
     [](v1::Robot& r) {
       r.mutable_joints(kKnee)->mutable_axis()->set_y(0);
       r.mutable_joints(kKnee)->mutable_axis()->set_x(1);
     },
     "r: legs[0].knee: found axis of front_left_knee not along y"},
    {"TipOnTheShank", [](v1::Robot& r) { *r.mutable_joints(kKnee)->mutable_tip_m() = r.legs(0).foot_m(); },
     "r: legs[0].knee: found front_left_knee with a tip_m, expected none: the leg's foot touches the ground"},
    {"RadiusWithoutTip", [](v1::Robot& r) { r.mutable_joints(kKnee)->set_tip_radius_m(0.01); },
     "tip_radius_m: found a radius without a tip, expected tip_m beside it"},
    {"NoShank", [](v1::Robot& r) { r.mutable_legs(0)->mutable_foot_m()->set_z(0); },
     "r: legs[0].knee: found segments of 0.22 and 0 m"},
    {"StraightKnee",
     [](v1::Robot& r) {
       r.mutable_joints(kKnee)->set_angle_max_rad(0.5);
       r.mutable_joints(kKnee)->set_stance_rad(0.02);
     },
     "r: legs[0].knee: found a knee bent by 0.02"},
    {"FeetUp",
     [](v1::Robot& r) {
       for (v1::Joint& joint : *r.mutable_joints()) {
         if (joint.name().find("hip") == std::string::npos) continue;
         joint.set_angle_max_rad(5);
         joint.set_stance_rad(3.9);
       }
     },
     "r: legs: found feet above the trunk in the stance"},
};

const Case kGuard[] = {
    {"TiltNotBelowAtOnce", [](v1::Robot& r) { r.mutable_guard()->set_tilt_rad(0.9); },
     "r: guard.tilt_rad: found 0.9, expected below guard.tilt_at_once_rad, 0.9"},
    {"PackLowNotBelowFloor", [](v1::Robot& r) { r.mutable_guard()->set_pack_low_v(40); },
     "r: guard.pack_low_v: found 40, expected below guard.pack_floor_v, 40"},
    {"PackFloorNotBelowNominal", [](v1::Robot& r) { r.mutable_guard()->set_pack_floor_v(48); },
     "r: guard.pack_floor_v: found 48, expected below pack.nominal_voltage_v, 48"},
    {"BaseLowAboveTheStance", [](v1::Robot& r) { r.mutable_guard()->set_base_low_m(0.4); },
     "r: guard.base_low_m: found 0.4, expected below the height of the stance, 0.34"},
    {"StopTooLong", [](v1::Robot& r) { r.mutable_guard()->set_damp_s(0.6); },
     "r: guard.lower_s: found damp_s + lower_s = 1.6, expected at most 1.5 s until torque off"},
    {"RateBeyondTheSensor", [](v1::Robot& r) { r.mutable_guard()->set_body_rate_rad_per_s(18); },
     "r: guard.body_rate_rad_per_s: found 18"},
    {"SensorBelowGravity", [](v1::Robot& r) { r.mutable_sensors()->set_acceleration_range_m_per_s2(9); },
     "r: sensors.acceleration_range_m_per_s2: found 9"},
    {"StaleWithinATick", [](v1::Robot& r) { r.mutable_guard()->set_frame_stale_s(0.001); },
     "r: guard.frame_stale_s: found 0.001, expected more than a tick, 0.001"},
    {"OverrunWithinATick", [](v1::Robot& r) { r.mutable_guard()->set_overrun_s(0.0005); },
     "r: guard.overrun_s: found 0.0005"},
    {"DriveTimeoutWithinTwoTicks",
     [](v1::Robot& r) {
       r.set_cycle_hz(500);
       r.mutable_guard()->set_drive_timeout_s(0.003);
     },
     "r: guard.drive_timeout_s: found 0.003"},
    {"JumpOfFewEncoderSteps", [](v1::Robot& r) { r.mutable_sensors()->set_encoder_step_rad(0.0125); },
     "r: guard.frame_jump_rad: found 0.2, expected at least 20 of sensors.encoder_step_rad, 0.25 (rad)"},
    {"UnknownCause", [](v1::Robot& r) { r.mutable_guard()->mutable_stops(0)->set_cause("boredom"); },
     "r: guard.stops[0].cause: found boredom, expected the name of a cause"},
    {"CauseNone", [](v1::Robot& r) { r.mutable_guard()->mutable_stops(0)->set_cause("none"); },
     "r: guard.stops[0].cause: found none"},
    {"CauseTwice", [](v1::Robot& r) { *r.mutable_guard()->add_stops() = r.guard().stops(0); },
     "r: guard.stops[1].cause: found operator_halt, said before"},
    {"HaltThatRampsDown", [](v1::Robot& r) { r.mutable_guard()->mutable_stops(0)->set_stop(v1::RAMP_DOWN); },
     "r: guard.stops[0].stop: found RAMP_DOWN, expected TORQUE_OFF"},
};

std::string name_of(const ::testing::TestParamInfo<Case>& info) { return info.param.name; }
INSTANTIATE_TEST_SUITE_P(Tree, RobotFileRefuses, ::testing::ValuesIn(kTree), name_of);
INSTANTIATE_TEST_SUITE_P(Joint, RobotFileRefuses, ::testing::ValuesIn(kJoint), name_of);
INSTANTIATE_TEST_SUITE_P(Leg, RobotFileRefuses, ::testing::ValuesIn(kLeg), name_of);
INSTANTIATE_TEST_SUITE_P(Guard, RobotFileRefuses, ::testing::ValuesIn(kGuard), name_of);

TEST(RobotFile, SoundIsAcceptedWithItsHashAndJointOrder) {
  const std::string text = fixture::text(fixture::robot());
  Defects defects;
  const auto file = parse_robot(text, "r", defects);
  ASSERT_TRUE(file) << lines(defects);
  EXPECT_EQ(file->sha256(), sha256(text));
  EXPECT_EQ(file->path(), "r");
  EXPECT_EQ(file->joint_count(), 10);
  EXPECT_EQ(file->joint_index("rear_left_knee"), 7);
  EXPECT_EQ(file->joint_index("wing"), -1);
}

TEST(RobotFile, ATrunkThatIsAThinPlateIsAcceptedAtTheEdgeOfTheTriangle) {
  // A plate: zz = xx + yy exactly (perpendicular axis theorem).
  EXPECT_EQ(why([](v1::Robot& r) {
              v1::Inertia& inertia = *r.mutable_trunk()->mutable_link()->mutable_inertia();
              inertia.Clear();
              inertia.set_xx(0.1);
              inertia.set_yy(0.2);
              inertia.set_zz(0.1 + 0.2);
            }),
            "accepted");
}

TEST(RobotFile, SeveralDefectsAreAllNamed) {
  const std::string text = why([](v1::Robot& r) {
    r.mutable_guard()->set_tilt_rad(1);
    r.mutable_joints(kKnee)->mutable_axis()->set_y(2);
    r.mutable_legs(3)->set_name("rear_left");
  });
  EXPECT_NE(text.find("guard.tilt_rad"), std::string::npos) << text;
  EXPECT_NE(text.find("joints[2].axis"), std::string::npos) << text;
  EXPECT_NE(text.find("legs[3].name"), std::string::npos) << text;
}

// Two segments of 0.22 m, hip 0.75 and knee -1.5 rad about +y: the foot stands at 2 * 0.22 cos 0.75 under the
// hip.
TEST(RobotFile, StanceHeightFollowsTheLegsGeometry) {
  EXPECT_NEAR(stance_height(fixture::robot()), 2 * 0.22 * std::cos(0.75) + 0.02, 1e-12);
}

TEST(RobotFile, CauseNamesAreThoseOfTheSafetyLayerInItsOrder) {
  const auto& names = cause_names();
  ASSERT_EQ(static_cast<int>(names.size()), safety::kCauseCount - 1);
  for (int i = 1; i < safety::kCauseCount; ++i) {
    EXPECT_EQ(names[static_cast<std::size_t>(i - 1)], safety::name(static_cast<safety::Cause>(i)));
  }
}

}  // namespace
}  // namespace pastern::files
