// Thermal model of each winding: first order, after IEC 60255-149 (formerly 60255-8).
//   d(theta)/dt = ((T / T_rated)^2 - theta) / tau,   limit at theta = 1
// with torque in the place of current: T_rated stands for k*IB. Exact for a constant load over a step, so
// that the step length does not matter.
#pragma once

#include "safety/units.h"

namespace pastern::safety {

/// From this fraction of the limit no new episode begins. Common practice, no source.
inline constexpr double kThermalHold = 0.9;

class ThermalModel {
 public:
  /// theta(t + span) = theta + (load^2 - theta) (1 - exp(-span / tau)). A rating or a time constant that is
  /// not positive, and a torque that is not finite, count as the worst.
  void step(int joint, double torque_nm, double rated_nm, double tau_s, double span_s) noexcept;

  [[nodiscard]] double theta(int joint) const noexcept { return theta_[joint]; }
  [[nodiscard]] double worst(int joint_count) const noexcept;
  [[nodiscard]] const PerJoint<Celsius>& state() const noexcept { return theta_; }
  /// An entry that is not finite or is negative becomes 1: heat that is not known is not assumed away.
  void restore(const PerJoint<Celsius>& state) noexcept;

 private:
  PerJoint<Celsius> theta_;  ///< fractions of the limit
};

}  // namespace pastern::safety
