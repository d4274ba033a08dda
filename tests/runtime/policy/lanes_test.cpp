// The stages over a scalar that is two numbers at once: what a lane type has to bring, and that each lane is
// the plain computation to the bit.
#include <gtest/gtest.h>

#include <cmath>
#include <cstring>

#include "runtime/control/pd.h"
#include "runtime/episode/recorder.h"
#include "runtime/policy/policy_parts.h"
#include "tests/runtime/support/robots.h"

namespace pastern::lanes {

/// Everything that the templates may ask of a scalar, and nothing else.
struct Two {
  double low{0};
  double high{0};
  Two() = default;
  explicit Two(double both) : low(both), high(both) {}
  Two(double first, double second) : low(first), high(second) {}
};
Two operator+(Two a, Two b) { return {a.low + b.low, a.high + b.high}; }
Two operator-(Two a, Two b) { return {a.low - b.low, a.high - b.high}; }
Two operator*(Two a, Two b) { return {a.low * b.low, a.high * b.high}; }
Two operator/(Two a, Two b) { return {a.low / b.low, a.high / b.high}; }
Two tanh(Two a) { return {std::tanh(a.low), std::tanh(a.high)}; }
Two acos(Two a) { return {std::acos(a.low), std::acos(a.high)}; }
Two abs(Two a) { return {std::abs(a.low), std::abs(a.high)}; }
Two min(Two a, Two b) { return {std::min(a.low, b.low), std::min(a.high, b.high)}; }
Two max(Two a, Two b) { return {std::max(a.low, b.low), std::max(a.high, b.high)}; }
int count_outside(Two value, Two low, Two high) {
  return policy::count_outside(value.low, low.low, high.low) +
         policy::count_outside(value.high, low.high, high.high);
}

namespace {

using policy::evaluate;
using policy::gait_phase;
using policy::scratch_of;
using policy::shape_of;

v1::Policy tanh_policy(const v1::Robot& robot) {
  v1::Policy policy = test::trot_policy(robot, 0.3, 0.03);
  policy.clear_channels();
  test::add_channel(policy, v1::Channel::ROLL);
  test::add_channel(policy, v1::Channel::PITCH_RATE, "", 0.2);
  test::add_channel(policy, v1::Channel::PHASE_SIN);
  test::add_channel(policy, v1::Channel::JOINT_OFFSET, robot.joints(4).name());
  v1::Layer& layer = *policy.mutable_layers(0);
  layer.set_inputs(4);
  layer.set_activation(v1::Layer::TANH);
  layer.set_has_bias(true);
  policy.clear_parameters();
  for (int i = 0; i < 5 * test::output_count(robot); ++i) {
    policy.add_parameters(0.1 * std::sin(2.7 * i));
  }
  return policy;
}

TEST(Lanes, PolicyPdAndReturnAreThePlainOnesInEachLane) {
  const v1::Robot robot = test::shipped_robot("dunlin12").robot();
  const v1::Policy policy = tanh_policy(robot);
  const auto wide = shape_of<Two>(policy, robot);
  const auto plain = shape_of<double>(policy, robot);
  const std::vector<double> parameters(policy.parameters().begin(), policy.parameters().end());
  const std::vector<Two> wide_parameters = [&] {
    std::vector<Two> out;
    for (const double parameter : parameters) {
      out.emplace_back(parameter, -2 * parameter);  // each lane walks parameters of its own
    }
    return out;
  }();
  std::vector<double> high_parameters;
  for (const double parameter : parameters) {
    high_parameters.push_back(-2 * parameter);
  }
  auto wide_scratch = scratch_of(wide);
  auto scratch = scratch_of(plain);

  BodyEstimate<Two> body;
  body.roll_rad = {0.1, -0.3};
  body.rate.y = {1.0, 2.0};
  JointAngles<Two> angle;
  JointSpeeds<Two> speed;
  for (int j = 0; j < 12; ++j) {
    angle[j] = {0.1 * j, 0.2 - 0.05 * j};
    speed[j] = {1.0 * j, -2.0};
  }
  const JointTarget<Two> both =
      evaluate(wide, wide_parameters.data(), wide_scratch, body, angle, speed, gait_phase(0.3));
  control::Gains<Two> gains;
  gains.joint_count = 12;
  gains.stiffness.fill(Two(120));
  gains.damping.fill(Two(3));
  const Torques<Two> torque = control::pd_torques(gains, both, angle, speed);
  const Two power = episode::joint_power(torque, speed, 12);
  episode::ReturnSums<Two> sums;
  episode::add(sums, episode::TickScore<Two>{Two(0.5, 2.0), power, Two(-0.1, 0.2), Two(0, 0.1)},
               episode::Weights{}, 0.001);

  int clipped = 0;
  for (const bool high : {false, true}) {
    const auto lane = [high](const Two& two) { return high ? two.high : two.low; };
    BodyEstimate<> body_one;
    body_one.roll_rad = lane(body.roll_rad);
    body_one.rate.y = lane(body.rate.y);
    JointAngles<> angle_one;
    JointSpeeds<> speed_one;
    for (int j = 0; j < 12; ++j) {
      angle_one[j] = lane(angle[j]);
      speed_one[j] = lane(speed[j]);
    }
    const JointTarget<> one = evaluate(plain, (high ? high_parameters : parameters).data(), scratch, body_one,
                                       angle_one, speed_one, gait_phase(0.3));
    control::Gains<> gains_one;
    gains_one.joint_count = 12;
    gains_one.stiffness.fill(120);
    gains_one.damping.fill(3);
    const Torques<> torque_one = control::pd_torques(gains_one, one, angle_one, speed_one);
    for (int j = 0; j < 12; ++j) {
      EXPECT_EQ(lane(both.angle[j]), one.angle[j]);
      EXPECT_EQ(lane(torque[j]), torque_one[j]);
    }
    EXPECT_EQ(lane(power), episode::joint_power(torque_one, speed_one, 12));
    EXPECT_EQ(lane(sums.forward), 0.001 * (high ? 0.8 : 0.5));
    clipped += one.clipped;
  }
  EXPECT_EQ(both.clipped, clipped);
}

}  // namespace
}  // namespace pastern::lanes
