// NaN and infinity in each single field of the frame, the torques and the targets: a trip, never a pass.
#include <functional>
#include <string>
#include <vector>

#include "tests/safety/fixture.h"

namespace pastern::safety {
namespace {

using test::kInf;
using test::kNan;
using test::Loop;

struct Field {
  std::string name;
  std::function<double&(Loop&)> of;
};

std::vector<Field> frame_fields(int joint_count) {
  std::vector<Field> fields{
      {"rate x", [](Loop& l) -> double& { return l.frame.rate.x; }},
      {"rate y", [](Loop& l) -> double& { return l.frame.rate.y; }},
      {"rate z", [](Loop& l) -> double& { return l.frame.rate.z; }},
      {"acceleration x", [](Loop& l) -> double& { return l.frame.acceleration.x; }},
      {"acceleration y", [](Loop& l) -> double& { return l.frame.acceleration.y; }},
      {"acceleration z", [](Loop& l) -> double& { return l.frame.acceleration.z; }},
      {"attitude w", [](Loop& l) -> double& { return l.frame.attitude.w; }},
      {"attitude x", [](Loop& l) -> double& { return l.frame.attitude.x; }},
      {"attitude y", [](Loop& l) -> double& { return l.frame.attitude.y; }},
      {"attitude z", [](Loop& l) -> double& { return l.frame.attitude.z; }},
      {"position x", [](Loop& l) -> double& { return l.frame.position.x; }},
      {"position y", [](Loop& l) -> double& { return l.frame.position.y; }},
      {"position z", [](Loop& l) -> double& { return l.frame.position.z; }},
      {"voltage", [](Loop& l) -> double& { return l.frame.pack_voltage_v; }},
      {"current", [](Loop& l) -> double& { return l.frame.pack_current_a; }},
  };
  for (int j = 0; j < joint_count; ++j) {
    const std::string joint = " " + std::to_string(j);
    fields.push_back({"angle" + joint, [j](Loop& l) -> double& { return l.frame.angle[j]; }});
    fields.push_back({"speed" + joint, [j](Loop& l) -> double& { return l.frame.speed[j]; }});
    fields.push_back({"torque" + joint, [j](Loop& l) -> double& { return l.frame.torque[j]; }});
    fields.push_back({"winding" + joint, [j](Loop& l) -> double& { return l.frame.winding[j]; }});
    fields.push_back({"housing" + joint, [j](Loop& l) -> double& { return l.frame.housing[j]; }});
  }
  return fields;
}

bool sound(const DriveCommand& command, const Limits& limits) {
  for (int j = 0; j < kMaxJoints; ++j) {
    const double most = j < limits.joint_count && command.torque_on() ? 30.0 : 0.0;
    if (!(std::fabs(command.torque()[j]) <= most)) return false;
  }
  return true;
}

TEST(NotFinite, EveryFieldOfTheFrameTripsAtOnceForEveryJointCount) {
  for (const int joint_count : {1, 3, 8, 12, kMaxJoints}) {
    for (const Field& field : frame_fields(joint_count)) {
      for (const double bad : {kNan, -kNan, kInf, -kInf}) {
        SCOPED_TRACE(field.name + " = " + std::to_string(bad));
        Loop loop(test::some_limits(joint_count));
        loop.frame.has_attitude = loop.frame.has_position = true;
        loop.ticks(3);
        ASSERT_EQ(loop.gate.phase(), Phase::armed);
        field.of(loop) = bad;
        const DriveCommand command = loop.tick();
        EXPECT_EQ(loop.gate.trip().cause, Cause::frame_not_finite);
        EXPECT_TRUE(std::isfinite(loop.gate.trip().value) && std::isfinite(loop.gate.trip().limit));
        EXPECT_TRUE(sound(command, loop.limits));
        // A ramp-down needs joint speeds that are numbers.
        const bool speed = field.name.rfind("speed", 0) == 0;
        EXPECT_EQ(loop.gate.phase(), speed ? Phase::off : Phase::damping);
        for (int i = 0; i < 400; ++i) EXPECT_TRUE(sound(loop.tick(), loop.limits));
        EXPECT_EQ(loop.gate.phase(), Phase::off);
      }
    }
  }
}

TEST(NotFinite, HugeAndTinyFieldsTripOrPassButNeverOverflowIntoAPass) {
  for (const Field& field : frame_fields(3)) {
    for (const double huge : {1e308, -1e308, 1e200, -1e200}) {
      SCOPED_TRACE(field.name + " = " + std::to_string(huge));
      Loop loop;
      loop.frame.has_attitude = loop.frame.has_position = true;
      loop.ticks(3);
      field.of(loop) = huge;
      EXPECT_TRUE(sound(loop.tick(), loop.limits));
      EXPECT_EQ(loop.gate.trip().cause, Cause::frame_out_of_range);
    }
    for (const double tiny : {5e-324, -5e-324, -0.0}) {
      Loop loop;
      loop.ticks(3);
      field.of(loop) = tiny;
      for (int i = 0; i < 50; ++i) EXPECT_TRUE(sound(loop.tick(), loop.limits)) << field.name;
    }
  }
}

TEST(NotFinite, AnInfiniteSpeedIsNeverDampedEvenUnderAnInfiniteLimit) {
  Limits limits = test::some_limits();
  for (auto& joint : limits.joint) joint.speed_max_rad_per_s = test::kInf;
  Loop wide(limits);
  wide.ticks(5);
  wide.frame.speed[0] = test::kInf;
  EXPECT_FALSE(wide.tick().torque_on());
  EXPECT_EQ(wide.gate.phase(), Phase::off);
}

TEST(NotFinite, WhatTheRobotDoesNotHaveIsNotJudged) {
  Loop loop;
  loop.frame.attitude.w = kNan;
  loop.frame.position.x = kInf;
  loop.frame.angle[3] = kNan;  // the fourth of three joints
  loop.frame.winding[3] = loop.frame.torque[3] = loop.frame.speed[3] = kNan;
  loop.wanted[3] = kNan;
  loop.target[3] = kNan;
  loop.wanted[4] = 10.0;
  for (int i = 0; i < 100; ++i) EXPECT_TRUE(sound(loop.tick(), loop.limits));
  EXPECT_FALSE(loop.gate.clamped());
  EXPECT_EQ(loop.gate.phase(), Phase::armed);
  EXPECT_EQ(loop.gate.hold(), Hold::none);
}

TEST(NotFinite, WantedTorquesAndTargetsTripAtOnce) {
  for (int j = 0; j < 3; ++j) {
    for (const double bad : {kNan, kInf, -kInf}) {
      for (const bool torque : {false, true}) {
        Loop loop;
        loop.ticks(3);
        (torque ? loop.wanted[j] : loop.target[j]) = bad;
        const DriveCommand command = loop.tick();
        EXPECT_EQ(loop.gate.trip().cause, Cause::command_not_finite);
        EXPECT_EQ(loop.gate.trip().joint, j);
        EXPECT_EQ(loop.gate.phase(), Phase::damping);
        EXPECT_TRUE(sound(command, loop.limits));
      }
    }
  }
}

TEST(NotFinite, HugeWantedTorquesAreClamped) {
  for (const double huge : {1e308, -1e308}) {
    Loop loop;
    for (int j = 0; j < 3; ++j) loop.wanted[j] = huge;
    for (int i = 0; i < 20; ++i) {
      EXPECT_TRUE(sound(loop.tick(), loop.limits));
      EXPECT_TRUE(loop.gate.clamped());
    }
    EXPECT_EQ(loop.gate.phase(), Phase::armed);
    EXPECT_EQ(loop.tick().torque()[1], huge > 0.0 ? 30.0 : -30.0);
  }
}

TEST(NotFinite, ALatenessThatIsNoNumberIsAnOverrun) {
  Loop loop;
  loop.ticks(3);
  loop.late_s = kNan;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.trip().cause, Cause::tick_overrun);
}

TEST(NotFinite, LimitsThatAreNoNumbersTripOrGiveNoTorque) {
  const std::vector<std::function<double&(Limits&)>> fields{
      [](Limits& l) -> double& { return l.tilt_rad; },
      [](Limits& l) -> double& { return l.tilt_at_once_rad; },
      [](Limits& l) -> double& { return l.body_rate_rad_per_s; },
      [](Limits& l) -> double& { return l.base_low_m; },
      [](Limits& l) -> double& { return l.pack_low_v; },
      [](Limits& l) -> double& { return l.pack_current_max_a; },
      [](Limits& l) -> double& { return l.rate_range_rad_per_s; },
      [](Limits& l) -> double& { return l.acceleration_range_m_per_s2; },
      [](Limits& l) -> double& { return l.frame_jump_rad; },
      [](Limits& l) -> double& { return l.overrun_s; },
      [](Limits& l) -> double& { return l.joint[1].trip_torque_nm; },
      [](Limits& l) -> double& { return l.joint[1].angle_min_rad; },
      [](Limits& l) -> double& { return l.joint[1].angle_max_rad; },
      [](Limits& l) -> double& { return l.joint[1].speed_max_rad_per_s; },
      [](Limits& l) -> double& { return l.joint[1].winding_max_c; },
  };
  for (std::size_t i = 0; i < fields.size(); ++i) {
    Limits limits = test::some_limits();
    fields[i](limits) = kNan;
    Loop loop(limits);
    loop.flags.watch_base = true;
    EXPECT_LE(loop.ticks_to_trip(100), 60) << i;
  }
  for (double JointLimits::*field : {&JointLimits::peak_torque_nm, &JointLimits::slew_nm_per_s}) {
    Limits limits = test::some_limits();
    limits.joint[1].*field = kNan;
    Loop loop(limits);
    loop.wanted[1] = 10.0;
    for (int i = 0; i < 20; ++i) EXPECT_EQ(loop.tick().torque()[1], 0.0);
  }
}

}  // namespace
}  // namespace pastern::safety
