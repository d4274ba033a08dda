// From a checked policy and robot to the plain numbers of its shape.
#include <cmath>
#include <string>

#include "runtime/policy/policy_parts.h"

namespace pastern::policy {

namespace {

// The reach stays this far, as a share, inside what the two links allow: at the straight and at the folded
// leg the knee's speed for a given change of length has no bound.
constexpr double kReachMargin = 0.002;
constexpr double kLeastReachShare = 0.05;  // of thigh and shank together, for links of equal length

int joint_index(const v1::Robot& robot, const std::string& name) {
  for (int j = 0; j < robot.joints_size(); ++j) {
    if (robot.joints(j).name() == name) {
      return j;
    }
  }
  return -1;
}

double wrapped(double angle_rad) { return std::remainder(angle_rad, 2.0 * M_PI); }

/// Direction of a vector in the leg plane against straight down, forward positive.
double direction(const v1::Xyz& vector) { return std::atan2(vector.x(), -vector.z()); }

TwoLink<double> two_link(const v1::Robot& robot, const v1::Leg& leg, const LegMap<double>& map) {
  const v1::Joint& knee = robot.joints(map.knee);
  const v1::Xyz& thigh = knee.origin_m();
  const v1::Xyz& shank = leg.foot_m();
  TwoLink<double> link;
  link.thigh_m = std::hypot(thigh.x(), thigh.z());
  link.shank_m = std::hypot(shank.x(), shank.z());
  const double bend_rad = wrapped(direction(shank) - direction(thigh) - map.knee_sign * knee.stance_rad());
  link.bend = bend_rad < 0 ? -1 : 1;
  link.length_m = std::sqrt(link.thigh_m * link.thigh_m + link.shank_m * link.shank_m +
                            2 * link.thigh_m * link.shank_m * std::cos(bend_rad));
  const double sum = link.thigh_m + link.shank_m;
  const double folded =
      std::max(std::abs(link.thigh_m - link.shank_m) * (1 + kReachMargin), sum * kLeastReachShare);
  // The stance itself is always within reach.
  link.longest_m = std::max(sum * (1 - kReachMargin), link.length_m);
  link.shortest_m = std::min(folded, link.length_m);
  return link;
}

LegMap<double> leg_map(const v1::Robot& robot, const v1::LegAction& action) {
  LegMap<double> map;
  for (const v1::Leg& leg : robot.legs()) {
    if (leg.name() == action.leg()) {
      map.hip = joint_index(robot, leg.hip());
      map.knee = joint_index(robot, leg.knee());
      map.abduction = leg.abduction().empty() ? -1 : joint_index(robot, leg.abduction());
      map.hip_sign = robot.joints(map.hip).axis().y() < 0 ? -1 : 1;
      map.knee_sign = robot.joints(map.knee).axis().y() < 0 ? -1 : 1;
      map.link = two_link(robot, leg, map);
    }
  }
  map.angle_rad = action.angle_rad();
  map.length_m = action.length_m();
  map.abduction_rad = action.abduction_rad();
  return map;
}

Input<double> input_of(const v1::Robot& robot, const v1::Channel& channel) {
  Input<double> input{channel.kind(), -1, channel.scale(), channel.offset()};
  if (channel.kind() == v1::Channel::JOINT_OFFSET || channel.kind() == v1::Channel::JOINT_SPEED) {
    input.joint = joint_index(robot, channel.joint());
  }
  if (channel.kind() == v1::Channel::JOINT_OFFSET) {
    input.offset += robot.joints(input.joint).stance_rad();
  }
  return input;
}

}  // namespace

Shape<double> plain_shape(const v1::Policy& policy, const v1::Robot& robot) {
  Shape<double> shape;
  for (const v1::Channel& channel : policy.channels()) {
    shape.inputs.push_back(input_of(robot, channel));
  }
  shape.widest = shape.inputs.size();
  for (const v1::Layer& layer : policy.layers()) {
    shape.layers.push_back({static_cast<int>(layer.outputs()), static_cast<int>(layer.inputs()),
                            layer.activation() == v1::Layer::TANH, layer.has_bias()});
    shape.parameter_count += parameters_of(shape.layers.back());
    shape.widest = std::max(shape.widest, static_cast<std::size_t>(layer.outputs()));
  }
  for (const v1::LegAction& action : policy.legs()) {
    shape.legs.push_back(leg_map(robot, action));
  }
  shape.joint_count = robot.joints_size();
  for (int j = 0; j < robot.joints_size(); ++j) {
    const auto i = static_cast<std::size_t>(j);
    shape.stance_rad[i] = robot.joints(j).stance_rad();
    shape.least_rad[i] = robot.joints(j).angle_min_rad();
    shape.most_rad[i] = robot.joints(j).angle_max_rad();
  }
  shape.gait_hz = policy.gait_hz();
  shape.rate_hz = policy.rate_hz();
  return shape;
}

}  // namespace pastern::policy
