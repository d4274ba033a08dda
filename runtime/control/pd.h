// PD torque of each joint. A template over the scalar; instantiated for double in pd.cpp.
#pragma once

#include <array>

#include "pastern/v1/robot.pb.h"
#include "runtime/types/body.h"
#include "safety/units.h"

namespace pastern::control {

template <class S = double>
struct Gains {
  int joint_count{0};
  std::array<S, safety::kMaxJoints> stiffness{};  ///< N m/rad
  std::array<S, safety::kMaxJoints> damping{};    ///< N m s/rad
};

[[nodiscard]] Gains<double> gains_of(const v1::Robot& robot);  // a checked robot

/// One joint: stiffness * (target - angle) - damping * speed. No clamp here: the gate clamps.
template <class S, class Gain>
[[nodiscard]] S pd_torque(const Gain& stiffness, const Gain& damping, const S& target, const S& angle,
                          const S& speed) noexcept {
  return stiffness * (target - angle) - damping * speed;
}

/// The same of all joints.
template <class S>
[[nodiscard]] Torques<S> pd_torques(const Gains<S>& gains, const JointTarget<S>& target,
                                    const JointAngles<S>& angle, const JointSpeeds<S>& speed) noexcept {
  Torques<S> torque;
  for (int j = 0; j < gains.joint_count; ++j) {
    const auto i = static_cast<std::size_t>(j);
    torque[j] = pd_torque(gains.stiffness[i], gains.damping[i], target.angle[j], angle[j], speed[j]);
  }
  return torque;
}

extern template Torques<double> pd_torques(const Gains<double>&, const JointTarget<double>&,
                                           const JointAngles<double>&, const JointSpeeds<double>&) noexcept;

}  // namespace pastern::control
