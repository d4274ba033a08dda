// A smooth way from one pose to another, and what comes before a walk. Cycle thread; no heap.
#pragma once

#include <cstdint>

#include "runtime/types/body.h"

namespace pastern::session {

/// Before its rise the robot lies parked for so long, for the gate's filters to see where it is ...
inline constexpr double kOnTheMark_s = 0.1;
/// ... and after its rise it stands for so long before it walks.
inline constexpr double kStand_s = 0.5;

/// Minimum-jerk course of time (Flash and Hogan, J. Neurosci. 5(7), 1985, eq. 1 for rest to rest):
/// 10 t^3 - 15 t^4 + 6 t^5 for t in [0, 1]; clamped outside.
[[nodiscard]] constexpr double smooth_share(double t) noexcept {
  if (!(t > 0.0)) return 0.0;
  if (t >= 1.0) return 1.0;
  return t * t * t * (10.0 + t * (-15.0 + 6.0 * t));
}

/// Joint angles, rad, on the way from `from` to `to`, `share` in [0, 1] of the way.
[[nodiscard]] inline JointAngles<> between(const JointAngles<>& from, const JointAngles<>& to, double share,
                                           int joint_count) noexcept {
  JointAngles<> pose;
  for (int j = 0; j < joint_count; ++j) pose[j] = from[j] + share * (to[j] - from[j]);
  return pose;
}

}  // namespace pastern::session
