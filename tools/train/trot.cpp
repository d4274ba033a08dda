// Sizes chosen for legs of about half a metre; training changes everything but the layout.
#include "tools/train/trot.h"

#include <cstdint>
#include <string>
#include <vector>

namespace pastern::tools {
namespace {

constexpr double kRate_hz = 50;
constexpr double kGait_hz = 2.5;
// An output of 1, and the start's share of it. Scales make one unit of every parameter matter about equally.
constexpr double kAngle_rad = 0.5;
constexpr double kLength_m = 0.06;
constexpr double kAbduction_rad = 0.25;
constexpr double kSwing = 0.4;
constexpr double kLift = 0.4;

void add_channel(v1::Policy& policy, v1::Channel::Kind kind, double scale, const std::string& joint = "") {
  v1::Channel& channel = *policy.add_channels();
  channel.set_kind(kind);
  channel.set_scale(scale);
  channel.set_joint(joint);
}

// Place of the leg's first joint in the trunk frame.
const v1::Xyz& root_of(const v1::Robot& robot, const v1::Leg& leg) {
  const std::string& first = leg.abduction().empty() ? leg.hip() : leg.abduction();
  for (const v1::Joint& joint : robot.joints()) {
    if (joint.name() == first) return joint.origin_m();
  }
  return v1::Xyz::default_instance();  // not reached with a checked robot
}

void add_channels(const v1::Robot& robot, v1::Policy& policy) {
  add_channel(policy, v1::Channel::ONE, 1);
  add_channel(policy, v1::Channel::ROLL, 2);
  add_channel(policy, v1::Channel::PITCH, 2);
  add_channel(policy, v1::Channel::ROLL_RATE, 0.25);
  add_channel(policy, v1::Channel::PITCH_RATE, 0.25);
  add_channel(policy, v1::Channel::YAW_RATE, 0.5);
  for (const v1::Joint& joint : robot.joints())
    add_channel(policy, v1::Channel::JOINT_OFFSET, 1, joint.name());
  add_channel(policy, v1::Channel::PHASE_SIN, 1);
  add_channel(policy, v1::Channel::PHASE_COS, 1);
}

}  // namespace

v1::Policy open_loop_trot(const v1::Robot& robot) {
  v1::Policy policy;
  policy.set_format(1);
  policy.set_name(robot.name() + "_start");
  policy.set_robot(robot.name());
  policy.set_scalar(v1::Policy::DOUBLE);
  policy.set_rate_hz(kRate_hz);
  policy.set_gait_hz(kGait_hz);
  add_channels(robot, policy);
  const int inputs = policy.channels_size();
  std::uint32_t outputs = 0;
  for (const v1::Leg& leg : robot.legs()) {
    v1::LegAction& action = *policy.add_legs();
    action.set_leg(leg.name());
    action.set_angle_rad(kAngle_rad);
    action.set_length_m(kLength_m);
    const v1::Xyz& root = root_of(robot, leg);
    const double turn = root.x() * root.y() >= 0 ? 1 : -1;
    std::vector<double> angle(static_cast<std::size_t>(inputs), 0);
    std::vector<double> length(static_cast<std::size_t>(inputs), 0);
    angle[static_cast<std::size_t>(inputs - 2)] = turn * kSwing;
    length[static_cast<std::size_t>(inputs - 1)] = -turn * kLift;
    policy.mutable_parameters()->Add(angle.begin(), angle.end());
    policy.mutable_parameters()->Add(length.begin(), length.end());
    outputs += 2;
    if (leg.abduction().empty()) continue;
    action.set_abduction_rad(kAbduction_rad);
    for (int i = 0; i < inputs; ++i) policy.add_parameters(0);
    ++outputs;
  }
  v1::Layer& layer = *policy.add_layers();
  layer.set_inputs(static_cast<std::uint32_t>(inputs));
  layer.set_outputs(outputs);
  layer.set_activation(v1::Layer::IDENTITY);
  v1::ParameterGroup& group = *policy.add_groups();
  group.set_name("all");
  group.set_count(static_cast<std::uint32_t>(policy.parameters_size()));
  group.set_perturbation_scale(0.05);
  return policy;
}

}  // namespace pastern::tools
