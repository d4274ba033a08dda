// The parts of a policy over a scalar S: observation, dense network, action map by leg geometry. Free
// functions on constant shapes and caller's scratch; no heap, no state. S is double or float on the robot;
// any type with
// + - * /, S(double), and (found by argument-dependent lookup) tanh, acos, min, max and count_outside
// elsewhere.
#pragma once

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <vector>

#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "runtime/types/body.h"
#include "safety/units.h"

namespace pastern::policy {

/// 1 when `value` is outside [low, high]; NaN is not counted. A lane type overloads it and returns how many
/// lanes.
[[nodiscard]] inline int count_outside(double value, double low, double high) noexcept {
  return value < low || value > high ? 1 : 0;
}

/// One input of the network: scale * (value - offset).
template <class S>
struct Input {
  v1::Channel::Kind kind{v1::Channel::ONE};
  int joint{-1};  ///< JOINT_OFFSET and JOINT_SPEED
  S scale{};
  S offset{};  ///< for JOINT_OFFSET the stance angle is in it
};

struct Dense {
  int outputs{0};
  int inputs{0};
  bool tanh{false};
  bool bias{false};
};

/// Hip and knee of a leg as a two-link mechanism in the plane of the hip and knee axes (x forward, z up).
/// The thigh is the vector hip -> knee axis, the shank the vector knee axis -> foot, both projected on the
/// plane.
template <class S>
struct TwoLink {
  S thigh_m{};
  S shank_m{};
  S bend{};        ///< +1 when the knee bends the foot forward of the thigh's line, -1 backward
  S length_m{};    ///< hip -> foot in the stance
  S shortest_m{};  ///< reach: clipped here, well clear of the folded and the straight leg
  S longest_m{};
  S thigh_to_leg_rad{};  ///< in the stance, of two_link_angles()
  S thigh_to_shank_rad{};
};

template <class S>
struct LegMap {
  int hip{0};
  int knee{0};
  int abduction{-1};  ///< -1: none
  S hip_sign{};       ///< +1: axis along +y; a positive angle takes the foot backward
  S knee_sign{};
  S angle_rad{};  ///< scale of each output
  S length_m{};
  S abduction_rad{};
  TwoLink<S> link;
};

/// Everything about a policy but its parameters. Made once, constant afterwards.
template <class S>
struct Shape {
  std::vector<Input<S>> inputs;
  std::vector<Dense> layers;
  std::vector<LegMap<S>> legs;
  int joint_count{0};
  std::array<S, safety::kMaxJoints> stance_rad{};
  std::array<S, safety::kMaxJoints> least_rad{};
  std::array<S, safety::kMaxJoints> most_rad{};
  std::size_t parameter_count{0};
  std::size_t widest{0};  ///< entries that each half of the scratch must have
  double gait_hz{0};
  double rate_hz{0};
};

/// Plain numbers of a checked policy and robot, in double; shape_of() turns them into S.
[[nodiscard]] Shape<double> plain_shape(const v1::Policy& policy, const v1::Robot& robot);

/// Two vectors of Shape::widest that the layers use in turn.
template <class S>
struct Scratch {
  std::vector<S> from;
  std::vector<S> to;
};

template <class S>
struct LinkAngles {
  S thigh_to_leg_rad{};    ///< from the thigh to the line hip -> foot, magnitude
  S thigh_to_shank_rad{};  ///< from the thigh's line to the shank, magnitude
};

/// Law of cosines: the two angles that put the foot at `length_m` from the hip.
template <class S>
[[nodiscard]] LinkAngles<S> two_link_angles(const TwoLink<S>& link, S length_m) noexcept {
  using std::acos;
  const S a = link.thigh_m;
  const S b = link.shank_m;
  const S l = length_m;
  return {acos((a * a + l * l - b * b) / (S(2) * a * l)), acos((l * l - a * a - b * b) / (S(2) * a * b))};
}

/// Plain numbers as S.
template <class S>
[[nodiscard]] Shape<S> shape_as(const Shape<double>& plain) {
  Shape<S> shape;
  for (const Input<double>& input : plain.inputs) {
    shape.inputs.push_back({input.kind, input.joint, S(input.scale), S(input.offset)});
  }
  shape.layers = plain.layers;
  for (const LegMap<double>& leg : plain.legs) {
    const TwoLink<double>& link = leg.link;
    LegMap<S> map{leg.hip,
                  leg.knee,
                  leg.abduction,
                  S(leg.hip_sign),
                  S(leg.knee_sign),
                  S(leg.angle_rad),
                  S(leg.length_m),
                  S(leg.abduction_rad),
                  {}};
    map.link = {S(link.thigh_m),    S(link.shank_m),   S(link.bend), S(link.length_m),
                S(link.shortest_m), S(link.longest_m), S(0),         S(0)};
    // In S, by the function that each step uses: an action of zero then cancels exactly.
    const LinkAngles<S> stance = two_link_angles(map.link, map.link.length_m);
    map.link.thigh_to_leg_rad = stance.thigh_to_leg_rad;
    map.link.thigh_to_shank_rad = stance.thigh_to_shank_rad;
    shape.legs.push_back(map);
  }
  shape.joint_count = plain.joint_count;
  for (std::size_t j = 0; j < shape.stance_rad.size(); ++j) {
    shape.stance_rad[j] = S(plain.stance_rad[j]);
    shape.least_rad[j] = S(plain.least_rad[j]);
    shape.most_rad[j] = S(plain.most_rad[j]);
  }
  shape.parameter_count = plain.parameter_count;
  shape.widest = plain.widest;
  shape.gait_hz = plain.gait_hz;
  shape.rate_hz = plain.rate_hz;
  return shape;
}

template <class S>
[[nodiscard]] Shape<S> shape_of(const v1::Policy& policy, const v1::Robot& robot) {
  return shape_as<S>(plain_shape(policy, robot));
}

template <class S>
[[nodiscard]] Scratch<S> scratch_of(const Shape<S>& shape) {
  return {std::vector<S>(shape.widest, S(0)), std::vector<S>(shape.widest, S(0))};
}

/// Sine and cosine of the gait phase. Lanes with clocks of their own bring a type with S in both places.
struct GaitPhase {
  double sine{0};
  double cosine{1};
};

/// `phase` in turns of the gait, 0..1.
[[nodiscard]] inline GaitPhase gait_phase(double phase) noexcept {
  constexpr double kTurn = 6.283185307179586476925286766559;
  return {std::sin(kTurn * phase), std::cos(kTurn * phase)};
}

template <class S, class Phase>
[[nodiscard]] S channel_value(const Input<S>& input, const BodyEstimate<S>& body, const JointAngles<S>& angle,
                              const JointSpeeds<S>& speed, const Phase& phase) noexcept {
  switch (input.kind) {
    case v1::Channel::ROLL:
      return body.roll_rad;
    case v1::Channel::PITCH:
      return body.pitch_rad;
    case v1::Channel::ROLL_RATE:
      return body.rate.x;
    case v1::Channel::PITCH_RATE:
      return body.rate.y;
    case v1::Channel::YAW_RATE:
      return body.rate.z;
    case v1::Channel::JOINT_OFFSET:
      return angle[input.joint];
    case v1::Channel::JOINT_SPEED:
      return speed[input.joint];
    case v1::Channel::PHASE_SIN:
      return S(phase.sine);
    case v1::Channel::PHASE_COS:
      return S(phase.cosine);
    default:
      return S(1);
  }
}

/// Shape::inputs entries to `out`.
template <class S, class Phase>
void observe(const Shape<S>& shape, const BodyEstimate<S>& body, const JointAngles<S>& angle,
             const JointSpeeds<S>& speed, const Phase& phase, S* out) noexcept {
  for (std::size_t i = 0; i < shape.inputs.size(); ++i) {
    const Input<S>& input = shape.inputs[i];
    out[i] = input.scale * (channel_value(input, body, angle, speed, phase) - input.offset);
  }
}

/// out = activation(W in + bias), W row by row, then the bias. Sums from the first input to the last, bias at
/// the end.
template <class S>
void dense(const Dense& layer, const S* parameters, const S* in, S* out) noexcept {
  using std::tanh;
  const std::size_t inputs = static_cast<std::size_t>(layer.inputs);
  const std::size_t outputs = static_cast<std::size_t>(layer.outputs);
  for (std::size_t row = 0; row < outputs; ++row) {
    S sum = S(0);
    for (std::size_t i = 0; i < inputs; ++i) {
      sum = sum + parameters[row * inputs + i] * in[i];
    }
    if (layer.bias) {
      sum = sum + parameters[outputs * inputs + row];
    }
    out[row] = layer.tanh ? tanh(sum) : sum;
  }
}

[[nodiscard]] inline std::size_t parameters_of(const Dense& layer) noexcept {
  const auto outputs = static_cast<std::size_t>(layer.outputs);
  return outputs * static_cast<std::size_t>(layer.inputs) + (layer.bias ? outputs : 0);
}

/// The observation stands in scratch.from; the returned actions stand in one of the two.
template <class S>
[[nodiscard]] const S* forward(const Shape<S>& shape, const S* parameters, Scratch<S>& scratch) noexcept {
  S* from = scratch.from.data();
  S* to = scratch.to.data();
  for (const Dense& layer : shape.layers) {
    dense(layer, parameters, from, to);
    parameters += parameters_of(layer);
    std::swap(from, to);
  }
  return from;
}

/// Into [low, high]; NaN stays NaN where min and max give their first argument when a comparison fails.
template <class S>
[[nodiscard]] S within(S value, S low, S high) noexcept {
  using std::max;
  using std::min;
  return min(max(value, low), high);
}

/// Actions -> joint targets. Leg angle phi: direction hip -> foot against the stance, rad, foot forward
/// positive; leg length l: distance hip -> foot against the stance, m. Turning about +y by theta takes a
/// hanging foot backward by theta, hence the signs. Joints of no leg hold the stance. `clipped` counts joints
/// whose target was outside their range, and legs whose length was outside the reach.
template <class S>
void map_actions(const Shape<S>& shape, const S* action, JointTarget<S>& target) noexcept {
  for (int j = 0; j < shape.joint_count; ++j) {
    target.angle[j] = shape.stance_rad[static_cast<std::size_t>(j)];
  }
  target.clipped = 0;
  for (const LegMap<S>& leg : shape.legs) {
    const S phi = leg.angle_rad * *action++;
    const S wanted_m = leg.link.length_m + leg.length_m * *action++;
    const S length_m = within(wanted_m, leg.link.shortest_m, leg.link.longest_m);
    target.clipped += count_outside(wanted_m, leg.link.shortest_m, leg.link.longest_m);
    const LinkAngles<S> angles = two_link_angles(leg.link, length_m);
    const S thigh = phi - leg.link.bend * (angles.thigh_to_leg_rad - leg.link.thigh_to_leg_rad);
    const S shank = leg.link.bend * (angles.thigh_to_shank_rad - leg.link.thigh_to_shank_rad);
    target.angle[leg.hip] = target.angle[leg.hip] - leg.hip_sign * thigh;
    target.angle[leg.knee] = target.angle[leg.knee] - leg.knee_sign * shank;
    if (leg.abduction >= 0) {
      target.angle[leg.abduction] = target.angle[leg.abduction] + leg.abduction_rad * *action++;
    }
  }
  for (int j = 0; j < shape.joint_count; ++j) {
    const auto i = static_cast<std::size_t>(j);
    target.clipped += count_outside(target.angle[j], shape.least_rad[i], shape.most_rad[i]);
    target.angle[j] = within(target.angle[j], shape.least_rad[i], shape.most_rad[i]);
  }
}

/// One step: observation, network, action map. A parameter for each thing that a policy sees.
template <class S, class Phase>  // NOLINTNEXTLINE(readability-function-size)
[[nodiscard]] JointTarget<S> evaluate(const Shape<S>& shape, const S* parameters, Scratch<S>& scratch,
                                      const BodyEstimate<S>& body, const JointAngles<S>& angle,
                                      const JointSpeeds<S>& speed, const Phase& phase) noexcept {
  observe(shape, body, angle, speed, phase, scratch.from.data());
  JointTarget<S> target;
  map_actions(shape, forward(shape, parameters, scratch), target);
  return target;
}

}  // namespace pastern::policy
