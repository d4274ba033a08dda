// Leg kinematics against the kinematics that check robot files, against differences, and against statics by
// hand.
#include "runtime/estimate/legs.h"

#include <gtest/gtest.h>

#include <cmath>

#include "proto/files/geometry.h"
#include "tests/runtime/support/robots.h"

namespace pastern::estimate {
namespace {

using test::shipped_robot;

const Eigen::Vector3d kUp = Eigen::Vector3d::UnitZ();

safety::SensorFrame frame_at(const v1::Robot& robot, double spread) {
  safety::SensorFrame frame;
  frame.joint_count = robot.joints_size();
  for (int j = 0; j < robot.joints_size(); ++j) {
    frame.angle[j] = robot.joints(j).stance_rad() + spread * std::sin(1.3 * j + 0.4);
    frame.speed[j] = 2 * std::cos(0.9 * j);
  }
  return frame;
}

std::vector<double> angles_of_frame(const safety::SensorFrame& frame) {
  return {frame.angle.values.begin(), frame.angle.values.begin() + frame.joint_count};
}

TEST(Legs, FeetStandWhereTheRobotFileSays) {
  for (const char* name : {"dunlin8", "dunlin12"}) {
    const v1::Robot robot = shipped_robot(name).robot();
    const Legs legs = legs_of(robot);
    ASSERT_EQ(legs.count, 4);
    const safety::SensorFrame frame = frame_at(robot, 0.3);
    const auto feet = files::feet_in_trunk(robot, angles_of_frame(frame));
    for (std::size_t i = 0; i < 4; ++i) {
      const FootState foot = foot_state(legs.leg[i], frame, kUp);
      EXPECT_NEAR(foot.at_m.x(), feet[i][0], 1e-14);
      EXPECT_NEAR(foot.at_m.y(), feet[i][1], 1e-14);
      EXPECT_NEAR(foot.at_m.z(), feet[i][2] - robot.legs(static_cast<int>(i)).foot_radius_m(), 1e-14);
    }
  }
}

TEST(Legs, FootVelocityIsThatOfThePointOfTheShank) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  const double h = 1e-6;
  // Without a radius the touching point is fixed to the shank and central differences show its velocity.
  v1::Robot pointed = robot;
  for (v1::Leg& leg : *pointed.mutable_legs()) {
    leg.set_foot_radius_m(0);
  }
  const Legs legs = legs_of(pointed);
  const safety::SensorFrame frame = frame_at(robot, 0.3);
  safety::SensorFrame before = frame;
  safety::SensorFrame after = frame;
  for (int j = 0; j < frame.joint_count; ++j) {
    before.angle[j] -= h * frame.speed[j];
    after.angle[j] += h * frame.speed[j];
  }
  for (std::size_t i = 0; i < 4; ++i) {
    const Eigen::Vector3d difference =
        (foot_state(legs.leg[i], after, kUp).at_m - foot_state(legs.leg[i], before, kUp).at_m) / (2 * h);
    EXPECT_LT((foot_state(legs.leg[i], frame, kUp).velocity_m_s - difference).norm(), 1e-8);
  }
}

TEST(Legs, ARollingFootMovesItsHipByTheCentreAndTheRadius) {
  // One straight leg of length l about its touching point: a hip turning at w moves the hip forward by w (l +
  // r).
  v1::Robot robot = shipped_robot("dunlin8").robot();
  const Legs legs = legs_of(robot);
  const LegGeometry& leg = legs.leg[0];
  safety::SensorFrame frame = frame_at(robot, 0);
  for (int i = 0; i < leg.joint_count; ++i) {
    frame.angle[leg.joint[static_cast<std::size_t>(i)]] = 0;
    frame.speed[leg.joint[static_cast<std::size_t>(i)]] = 0;
  }
  frame.speed[leg.joint[0]] = 1.5;
  const v1::Joint& knee = robot.joints(leg.joint[1]);
  const double length = -knee.origin_m().z() - robot.legs(0).foot_m().z() + robot.legs(0).foot_radius_m();
  const FootState foot = foot_state(leg, frame, kUp);
  EXPECT_NEAR(foot.velocity_m_s.x(), -1.5 * length, 1e-12) << "about +y a hanging foot goes backward";
}

TEST(Legs, PushIsTheForceThatTheTorquesHold) {
  for (const char* name : {"dunlin8", "dunlin12"}) {
    const v1::Robot robot = shipped_robot(name).robot();
    const Legs legs = legs_of(robot);
    safety::SensorFrame frame = frame_at(robot, 0.1);
    const double h = 1e-6;
    for (const double push : {0.0, 60.0, -20.0}) {
      for (std::size_t i = 0; i < 4; ++i) {
        const LegGeometry& leg = legs.leg[i];
        // Virtual work: the torque of a joint is the force times how far the foot goes down for a radian of
        // it.
        for (int k = 0; k < leg.joint_count; ++k) {
          safety::SensorFrame moved = frame;
          moved.angle[leg.joint[static_cast<std::size_t>(k)]] += h;
          const Eigen::Vector3d step = foot_state(leg, moved, kUp).at_m - foot_state(leg, frame, kUp).at_m;
          frame.torque[leg.joint[static_cast<std::size_t>(k)]] = -push * step.z() / h;
        }
        // The regularisation gives away at most (0.015 / 0.1)^2 for a lever of 0.1 m.
        EXPECT_NEAR(foot_state(leg, frame, kUp).push_n, push, 0.023 * std::abs(push) + 1e-9) << name << i;
      }
    }
  }
}

TEST(Legs, AStraightLegGivesAFiniteForce) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  const Legs legs = legs_of(robot);
  safety::SensorFrame frame = frame_at(robot, 0);
  for (int j = 0; j < frame.joint_count; ++j) {
    frame.angle[j] = 0;
    frame.torque[j] = 30;
  }
  EXPECT_TRUE(std::isfinite(foot_state(legs.leg[0], frame, kUp).push_n));
}

}  // namespace
}  // namespace pastern::estimate
