// The pure part of the gate: clamps and fades of one joint's torque, over any scalar (scalar.h). No state.
// Each is written so that NaN ends as zero torque or at the near edge, never as a pass.
#pragma once

#include "safety/scalar.h"

namespace pastern::safety {

/// 0 where x <= 0 or x is not a number, 1 where x >= 1, x between.
template <class S>
[[nodiscard]] constexpr S fraction(const S& x) noexcept {
  return select(x > S(0.0), select(x < S(1.0), x, S(1.0)), S(0.0));
}

/// Limits a torque to +-peak (peak >= 0). NaN becomes 0.
template <class S>
[[nodiscard]] constexpr S peak_clamp(const S& torque, const S& peak) noexcept {
  const S high = select(torque > peak, peak, select(torque >= -peak, torque, S(0.0)));
  return select(torque < -peak, -peak, high);
}

/// Limits the change from the torque `before` of the last tick to +-step (step >= 0). NaN takes the step
/// down. The result lies between `before` and `torque`, so what held for both still holds.
template <class S>
[[nodiscard]] constexpr S slew_clamp(const S& torque, const S& before, const S& step) noexcept {
  const S low = before - step;
  const S high = before + step;
  return select(torque >= low, select(torque <= high, torque, high), low);
}

/// Where the joint stands within `width` of an edge of its range, torque that pushes towards that edge fades
/// linearly to zero at the edge. Torque that pushes back stays. All rad, N m.
template <class S>
[[nodiscard]] constexpr S edge_fade(const S& torque, const S& angle, const S& angle_min, const S& angle_max,
                                    const S& width) noexcept {
  const S upward = fraction((angle_max - angle) / width);
  const S downward = fraction((angle - angle_min) / width);
  return torque * select(torque > S(0.0), upward, downward);
}

/// From `soft` to `hard` joint speed, torque that speeds the joint up fades linearly to zero. rad/s, N m.
template <class S>
[[nodiscard]] constexpr S speed_fade(const S& torque, const S& speed, const S& soft, const S& hard) noexcept {
  const S width = hard - soft;
  const S forward = fraction((hard - speed) / width);
  const S backward = fraction((hard + speed) / width);
  return torque * select(torque > S(0.0), forward, backward);
}

}  // namespace pastern::safety
