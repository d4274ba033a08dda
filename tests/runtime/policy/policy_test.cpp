// Policy: action map against kinematics written elsewhere, network by hand, determinism, what is not finite.
#include "runtime/policy/policy.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstring>
#include <limits>

#include "proto/files/geometry.h"
#include "runtime/policy/policy_parts.h"
#include "tests/runtime/support/robots.h"

namespace pastern::policy {
namespace {

using test::add_channel;
using test::shipped_robot;
using test::still_policy;
using test::trot_policy;

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

/// The same robot with hip and knee axes along -y, and with joints and feet off the straight line, so that
/// constant angles come in. Limits are opened; files::parse_robot is not asked.
v1::Robot skewed(v1::Robot robot, bool flip_hips, bool flip_knees) {
  for (v1::Leg& leg : *robot.mutable_legs()) {
    v1::Joint& hip = *robot.mutable_joints(files::find_joint(robot, leg.hip()));
    v1::Joint& knee = *robot.mutable_joints(files::find_joint(robot, leg.knee()));
    if (flip_hips) {
      hip.mutable_axis()->set_y(-hip.axis().y());
      hip.set_stance_rad(-hip.stance_rad());
    }
    if (flip_knees) {
      knee.mutable_axis()->set_y(-knee.axis().y());
      knee.set_stance_rad(-knee.stance_rad());
    }
    knee.mutable_origin_m()->set_x(0.03);
    leg.mutable_foot_m()->set_x(-0.02);
    for (v1::Joint* joint : {&hip, &knee}) {
      joint->set_angle_min_rad(-6);
      joint->set_angle_max_rad(6);
    }
  }
  return robot;
}

struct Polar {
  double angle_rad;
  double length_m;
};

/// Hip -> foot in the hip and knee plane, by files::feet_in_trunk: another implementation of the kinematics.
/// The hip's place is the foot's place when knee and foot are put into the hip.
std::vector<Polar> legs_at(const v1::Robot& robot, const JointAngles<>& target) {
  std::vector<double> angles;
  for (int j = 0; j < robot.joints_size(); ++j) {
    angles.push_back(target[j]);
  }
  v1::Robot hips = robot;
  for (v1::Leg& leg : *hips.mutable_legs()) {
    v1::Xyz& knee = *hips.mutable_joints(files::find_joint(hips, leg.knee()))->mutable_origin_m();
    for (v1::Xyz* xyz : {&knee, leg.mutable_foot_m()}) {
      xyz->set_x(0);
      xyz->set_y(0);
      xyz->set_z(0);
    }
  }
  const auto feet = files::feet_in_trunk(robot, angles);
  const auto origins = files::feet_in_trunk(hips, angles);
  std::vector<Polar> polar;
  for (std::size_t i = 0; i < feet.size(); ++i) {
    const double x = feet[i][0] - origins[i][0];
    const double z = feet[i][2] - origins[i][2];
    polar.push_back({std::atan2(x, -z), std::hypot(x, z)});
  }
  return polar;
}

JointTarget<> mapped(const v1::Robot& robot, const std::vector<double>& action) {
  const Shape<double> shape = shape_of<double>(still_policy(robot), robot);
  JointTarget<> target;
  map_actions(shape, action.data(), target);
  return target;
}

std::vector<v1::Robot> robots() {
  const v1::Robot twelve = shipped_robot("dunlin12").robot();
  const v1::Robot eight = shipped_robot("dunlin8").robot();
  return {twelve,
          eight,
          skewed(twelve, false, false),
          skewed(twelve, true, false),
          skewed(eight, false, true),
          skewed(eight, true, true)};
}

TEST(ActionMap, ZeroActionIsTheStanceToTheBit) {
  for (const v1::Robot& robot : robots()) {
    const JointTarget<> target =
        mapped(robot, std::vector<double>(static_cast<std::size_t>(test::output_count(robot)), 0.0));
    for (int j = 0; j < robot.joints_size(); ++j) {
      EXPECT_EQ(target.angle[j], robot.joints(j).stance_rad())
          << robot.name() << " " << robot.joints(j).name();
    }
    EXPECT_EQ(target.clipped, 0);
  }
}

TEST(ActionMap, ZeroActionIsTheStanceToTheBitInFloatToo) {
  for (const v1::Robot& robot : robots()) {
    const Shape<float> shape = shape_of<float>(still_policy(robot), robot);
    const std::vector<float> action(64, 0.0F);
    JointTarget<float> target;
    map_actions(shape, action.data(), target);
    for (int j = 0; j < robot.joints_size(); ++j) {
      EXPECT_EQ(target.angle[j], static_cast<float>(robot.joints(j).stance_rad()));
    }
  }
}

TEST(ActionMap, TheFootGoesWhereLegAngleAndLengthSay) {
  for (const v1::Robot& robot : robots()) {
    const std::size_t count = static_cast<std::size_t>(test::output_count(robot));
    const std::vector<Polar> stance = legs_at(robot, mapped(robot, std::vector<double>(count, 0.0)).angle);
    for (const double phi : {-0.4, -0.05, 0.2, 0.5}) {
      for (const double length : {-0.08, -0.01, 0.03}) {
        std::vector<double> action;
        for (const v1::Leg& leg : robot.legs()) {
          action.insert(action.end(), {phi, length});
          if (!leg.abduction().empty()) {
            action.push_back(0);
          }
        }
        const JointTarget<> target = mapped(robot, action);
        ASSERT_EQ(target.clipped, 0) << robot.name() << " " << phi << " " << length;
        const std::vector<Polar> legs = legs_at(robot, target.angle);
        for (std::size_t i = 0; i < legs.size(); ++i) {
          // Rounding only: acos near +-1 loses half the digits, the reach keeps it away from there.
          EXPECT_NEAR(legs[i].length_m, stance[i].length_m + length, 1e-12) << robot.name();
          EXPECT_NEAR(legs[i].angle_rad, stance[i].angle_rad + phi, 1e-12) << robot.name();
        }
      }
    }
  }
}

TEST(ActionMap, AbductionAddsToTheStance) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  std::vector<double> action(12, 0.0);
  action[2] = 0.11;
  action[11] = -0.07;
  const JointTarget<> target = mapped(robot, action);
  const int first = files::find_joint(robot, robot.legs(0).abduction());
  const int last = files::find_joint(robot, robot.legs(3).abduction());
  EXPECT_DOUBLE_EQ(target.angle[first], robot.joints(first).stance_rad() + 0.11);
  EXPECT_DOUBLE_EQ(target.angle[last], robot.joints(last).stance_rad() - 0.07);
}

TEST(ActionMap, WhatCannotBeReachedIsClippedAndCounted) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  for (const double length : {-5.0, 5.0, -1e300, 1e300}) {
    std::vector<double> action(12, 0.0);
    action[1] = length;
    const JointTarget<> target = mapped(robot, action);
    EXPECT_GE(target.clipped, 1);
    for (int j = 0; j < robot.joints_size(); ++j) {
      EXPECT_GE(target.angle[j], robot.joints(j).angle_min_rad());
      EXPECT_LE(target.angle[j], robot.joints(j).angle_max_rad());
    }
  }
  std::vector<double> action(12, 0.0);
  action[0] = 100;  // leg angle alone: the hip is over its range
  const JointTarget<> target = mapped(robot, action);
  EXPECT_EQ(target.clipped, 1);
  const int hip = files::find_joint(robot, robot.legs(0).hip());
  EXPECT_EQ(target.angle[hip], robot.joints(hip).angle_min_rad())
      << "axis +y: a foot forward is a negative hip";
}

TEST(ActionMap, NotANumberStaysOneAndIsNotCounted) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  std::vector<double> action(12, 0.0);
  action[1] = kNan;
  const JointTarget<> target = mapped(robot, action);
  EXPECT_TRUE(std::isnan(target.angle[files::find_joint(robot, robot.legs(0).hip())]));
  EXPECT_TRUE(std::isnan(target.angle[files::find_joint(robot, robot.legs(0).knee())]));
  EXPECT_FALSE(std::isnan(target.angle[files::find_joint(robot, robot.legs(1).hip())]));
  EXPECT_EQ(target.clipped, 0);
}

TEST(Network, TwoLayersByHand) {
  // [tanh(1*2 + 2*3 - 7.5), tanh(0.5*2 - 1*3 + 2.25)] = [tanh 0.5, tanh 0.25], then 4 a - 8 b.
  Shape<double> shape;
  shape.layers = {{2, 2, true, true}, {1, 2, false, false}};
  shape.widest = 2;
  Scratch<double> scratch = scratch_of(shape);
  scratch.from = {2, 3};
  const std::vector<double> parameters{1, 2, 0.5, -1, -7.5, 2.25, 4, -8};
  EXPECT_DOUBLE_EQ(forward(shape, parameters.data(), scratch)[0], 4 * std::tanh(0.5) - 8 * std::tanh(0.25));
}

TEST(Observation, EveryChannelReadsItsOwnQuantity) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  v1::Policy policy = still_policy(robot);
  policy.clear_channels();
  const std::string joint = robot.joints(3).name();
  for (const v1::Channel::Kind kind :
       {v1::Channel::ONE, v1::Channel::ROLL, v1::Channel::PITCH, v1::Channel::ROLL_RATE,
        v1::Channel::PITCH_RATE, v1::Channel::YAW_RATE, v1::Channel::JOINT_OFFSET, v1::Channel::JOINT_SPEED,
        v1::Channel::PHASE_SIN, v1::Channel::PHASE_COS}) {
    add_channel(policy, kind, joint, 2.0, 0.25);
  }
  const Shape<double> shape = plain_shape(policy, robot);
  BodyEstimate<> body;
  body.roll_rad = 0.1;
  body.pitch_rad = 0.2;
  body.yaw_rad = 99;  // not observed
  body.rate = {0.3, 0.4, 0.5};
  JointAngles<> angle;
  angle[3] = robot.joints(3).stance_rad() + 0.6;
  JointSpeeds<> speed;
  speed[3] = 0.7;
  std::vector<double> seen(10);
  observe(shape, body, angle, speed, gait_phase(0.125), seen.data());
  const std::vector<double> raw{1, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, std::sqrt(0.5), std::sqrt(0.5)};
  for (std::size_t i = 0; i < raw.size(); ++i) {
    EXPECT_NEAR(seen[i], 2 * (raw[i] - 0.25), 1e-14) << i;
  }
}

struct Inputs {
  BodyEstimate<> body;
  JointAngles<> angle;
  JointSpeeds<> speed;
};

/// Something irregular, a function of the step alone.
Inputs inputs_at(int step) {
  Inputs in;
  in.body.roll_rad = 0.1 * std::sin(0.37 * step);
  in.body.pitch_rad = 0.07 * std::cos(0.11 * step);
  in.body.rate = {std::sin(1.7 * step), std::cos(2.3 * step), 0.2 * std::sin(5.1 * step)};
  for (int j = 0; j < 12; ++j) {
    in.angle[j] = std::sin(0.19 * step + j);
    in.speed[j] = 3 * std::cos(0.31 * step - j);
  }
  return in;
}

/// All channels, a tanh layer, and weights that are a function of their index.
v1::Policy busy_policy(const v1::Robot& robot, v1::Policy::Scalar scalar) {
  v1::Policy policy = trot_policy(robot, 0.3, 0.03);
  policy.set_scalar(scalar);
  policy.clear_channels();
  for (const v1::Channel::Kind kind : {v1::Channel::ONE, v1::Channel::ROLL, v1::Channel::PITCH_RATE,
                                       v1::Channel::PHASE_SIN, v1::Channel::PHASE_COS}) {
    add_channel(policy, kind);
  }
  for (const v1::Joint& joint : robot.joints()) {
    add_channel(policy, v1::Channel::JOINT_OFFSET, joint.name());
    add_channel(policy, v1::Channel::JOINT_SPEED, joint.name(), 0.1);
  }
  const int inputs = policy.channels_size();
  const int outputs = test::output_count(robot);
  policy.clear_layers();
  for (const auto& [in, out] : {std::pair{inputs, 16}, std::pair{16, outputs}}) {
    v1::Layer& layer = *policy.add_layers();
    layer.set_inputs(static_cast<std::uint32_t>(in));
    layer.set_outputs(static_cast<std::uint32_t>(out));
    layer.set_activation(out == 16 ? v1::Layer::TANH : v1::Layer::IDENTITY);
    layer.set_has_bias(true);
  }
  policy.clear_parameters();
  const int count = (inputs + 1) * 16 + 17 * outputs;
  for (int i = 0; i < count; ++i) {
    policy.add_parameters((i < (inputs + 1) * 16 ? 0.2 : 0.012) * std::sin(1.0 + 7.3 * i));
  }
  return policy;
}

TEST(Policy, SameInputsGiveTheSameBits) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  for (const v1::Policy::Scalar scalar : {v1::Policy::DOUBLE, v1::Policy::FLOAT}) {
    const auto one = Policy::make(busy_policy(robot, scalar), robot);
    const auto other = Policy::make(busy_policy(robot, scalar), robot);
    std::vector<JointTarget<>> first;
    for (int step = 0; step < 500; ++step) {
      const Inputs in = inputs_at(step);
      first.push_back(one->step(in.body, in.angle, in.speed, 0.02));
      const JointTarget<> target = other->step(in.body, in.angle, in.speed, 0.02);
      ASSERT_EQ(std::memcmp(&target.angle, &first.back().angle, sizeof(target.angle)), 0);
    }
    one->reset();
    for (int step = 0; step < 500; ++step) {
      const Inputs in = inputs_at(step);
      const JointTarget<> target = one->step(in.body, in.angle, in.speed, 0.02);
      ASSERT_EQ(
          std::memcmp(&target.angle, &first[static_cast<std::size_t>(step)].angle, sizeof(target.angle)), 0)
          << "reset() starts the gait anew";
    }
  }
}

TEST(Policy, FloatFollowsDouble) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  const auto wide = Policy::make(busy_policy(robot, v1::Policy::DOUBLE), robot);
  const auto narrow = Policy::make(busy_policy(robot, v1::Policy::FLOAT), robot);
  double moved = 0;
  for (int step = 0; step < 300; ++step) {
    const Inputs in = inputs_at(step);
    const JointTarget<> exact = wide->step(in.body, in.angle, in.speed, 0.02);
    const JointTarget<> rounded = narrow->step(in.body, in.angle, in.speed, 0.02);
    for (int j = 0; j < 12; ++j) {
      // 29 inputs and 16 units of order one at 2^-24 each, times the leg's lever of about 1/0.2 m.
      EXPECT_NEAR(rounded.angle[j], exact.angle[j], 1e-4);
      moved = std::max(moved, std::abs(exact.angle[j] - robot.joints(j).stance_rad()));
    }
  }
  EXPECT_GT(moved, 0.02) << "the comparison must not be between two that stand still";
}

TEST(Policy, LoadTakesEffectAndParametersAreCounted) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  const v1::Policy trot = trot_policy(robot, 0.3, 0.03);
  const auto policy = Policy::make(still_policy(robot), robot);
  EXPECT_EQ(policy->parameter_count(), 24u);
  const Inputs in = inputs_at(1);
  const JointTarget<> still = policy->step(in.body, in.angle, in.speed, 0.02);
  policy->load(Parameters(trot.parameters().begin(), trot.parameters().end()));
  policy->reset();
  const JointTarget<> walking = policy->step(in.body, in.angle, in.speed, 0.02);
  EXPECT_EQ(still.angle[1], robot.joints(1).stance_rad());
  EXPECT_NE(walking.angle[1], robot.joints(1).stance_rad());
}

TEST(Policy, ATrotIsDiagonalAndPeriodic) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  const auto policy = Policy::make(trot_policy(robot, 0.3, 0.03), robot);
  const Inputs in = inputs_at(0);
  std::vector<std::vector<Polar>> legs;
  for (int step = 0; step < 40; ++step) {  // 2.5 Hz at 50 Hz: 20 steps a period
    legs.push_back(legs_at(robot, policy->step(in.body, in.angle, in.speed, 0.02).angle));
  }
  const std::vector<Polar>& start = legs[0];
  double reach = 0;
  for (std::size_t step = 0; step < 20; ++step) {
    EXPECT_NEAR(legs[step][0].angle_rad - start[0].angle_rad, legs[step][3].angle_rad - start[3].angle_rad,
                1e-12);
    EXPECT_NEAR(legs[step][0].angle_rad - start[0].angle_rad, -(legs[step][1].angle_rad - start[1].angle_rad),
                1e-12);
    EXPECT_NEAR(legs[step][0].length_m, legs[step + 20][0].length_m, 1e-9);
    reach = std::max(reach, legs[step][0].angle_rad - start[0].angle_rad);
  }
  EXPECT_NEAR(reach, 0.3, 1e-12) << "a quarter of 20 steps meets the sine's top";
}

TEST(Policy, WhatIsNotFiniteReachesTheTargetAndLeavesNothingBehind) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  for (const v1::Policy::Scalar scalar : {v1::Policy::DOUBLE, v1::Policy::FLOAT}) {
    const auto policy = Policy::make(busy_policy(robot, scalar), robot);
    const auto clean = Policy::make(busy_policy(robot, scalar), robot);
    const Inputs good = inputs_at(2);
    for (const double bad : {kNan, std::numeric_limits<double>::infinity(), 1e300}) {
      Inputs in = inputs_at(1);
      in.angle[5] = bad;
      const JointTarget<> target = policy->step(in.body, in.angle, in.speed, 0.02);
      const JointTarget<> unused =
          clean->step(inputs_at(1).body, inputs_at(1).angle, inputs_at(1).speed, 0.02);
      EXPECT_TRUE(!std::isnan(bad) || std::isnan(target.angle[0]));
      EXPECT_FALSE(std::isnan(unused.angle[0]));
      const JointTarget<> after = policy->step(good.body, good.angle, good.speed, 0.02);
      const JointTarget<> expected = clean->step(good.body, good.angle, good.speed, 0.02);
      EXPECT_EQ(std::memcmp(&after.angle, &expected.angle, sizeof(after.angle)), 0);
    }
  }
}

TEST(Policy, GroupsOfTheFileOrOneOfAll) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  v1::Policy policy = still_policy(robot);
  ASSERT_EQ(groups_of(policy).size(), 1u);
  EXPECT_EQ(groups_of(policy)[0].count, 24u);
  EXPECT_EQ(groups_of(policy)[0].perturbation_scale, kDefaultPerturbation);
  v1::ParameterGroup& group = *policy.add_groups();
  group.set_name("front");
  group.set_first(3);
  group.set_count(5);
  group.set_perturbation_scale(0.2);
  ASSERT_EQ(groups_of(policy).size(), 1u);
  EXPECT_EQ(groups_of(policy)[0].name, "front");
  EXPECT_EQ(groups_of(policy)[0].first, 3u);
  EXPECT_EQ(groups_of(policy)[0].count, 5u);
  EXPECT_EQ(groups_of(policy)[0].perturbation_scale, 0.2);
}

}  // namespace
}  // namespace pastern::policy
