// Shipped robots and a hand-made trot for the tests of the stages.
#pragma once

#include <gtest/gtest.h>

#include <string>

#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "proto/files/robot_file.h"

namespace pastern::test {

inline files::RobotFile shipped_robot(const std::string& name) {
  files::Defects defects;
  const std::string path = std::string(PASTERN_SOURCE_DIR) + "/hal_stub/robots/" + name + ".robot.txtpb";
  auto robot = files::read_robot(path, defects);
  if (!robot) {
    ADD_FAILURE() << files::lines(defects);
    std::abort();
  }
  return *robot;
}

inline void add_channel(v1::Policy& policy, v1::Channel::Kind kind, const std::string& joint = "",
                        double scale = 1, double offset = 0) {
  v1::Channel& channel = *policy.add_channels();
  channel.set_kind(kind);
  channel.set_joint(joint);
  channel.set_scale(scale);
  channel.set_offset(offset);
}

/// Outputs of a policy for this robot: two a leg, three for a leg with abduction.
inline int output_count(const v1::Robot& robot) {
  int count = 0;
  for (const v1::Leg& leg : robot.legs()) {
    count += leg.abduction().empty() ? 2 : 3;
  }
  return count;
}

/// A linear policy with these channels and all parameters zero; outputs in rad and m as they are.
inline v1::Policy still_policy(const v1::Robot& robot) {
  v1::Policy policy;
  policy.set_format(1);
  policy.set_name("still");
  policy.set_robot(robot.name());
  policy.set_scalar(v1::Policy::DOUBLE);
  policy.set_rate_hz(50);
  policy.set_gait_hz(2.5);
  add_channel(policy, v1::Channel::ONE);
  add_channel(policy, v1::Channel::PHASE_SIN);
  add_channel(policy, v1::Channel::PHASE_COS);
  for (const v1::Leg& leg : robot.legs()) {
    v1::LegAction& action = *policy.add_legs();
    action.set_leg(leg.name());
    action.set_angle_rad(1);
    action.set_length_m(1);
    action.set_abduction_rad(1);
  }
  v1::Layer& layer = *policy.add_layers();
  layer.set_inputs(3);
  layer.set_outputs(static_cast<std::uint32_t>(output_count(robot)));
  layer.set_activation(v1::Layer::IDENTITY);
  policy.mutable_parameters()->Resize(3 * output_count(robot), 0.0);
  return policy;
}

/// Leg angle as the sine of the phase, leg length as the cosine; diagonal legs together.
inline v1::Policy trot_policy(const v1::Robot& robot, double swing_rad, double lift_m) {
  v1::Policy policy = still_policy(robot);
  int row = 0;
  for (int l = 0; l < robot.legs_size(); ++l) {
    const double side = (l == 0 || l == 3) ? 1 : -1;
    policy.set_parameters(3 * row + 1, side * swing_rad);
    policy.set_parameters(3 * (row + 1) + 2, -side * lift_m);
    row += robot.legs(l).abduction().empty() ? 2 : 3;
  }
  return policy;
}

}  // namespace pastern::test
