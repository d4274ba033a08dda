// How high the trunk stands over its lowest foot, from joint angles and the gate's own tilt alone.
#pragma once

#include "safety/limits.h"
#include "safety/units.h"

namespace pastern::safety {

/// Foot of one leg in the trunk frame, m: p = o_1 + R(a_1, q_1) (o_2 + R(a_2, q_2) (... + foot)), the product
/// of hinge rotations (Rodrigues) from the foot inwards.
[[nodiscard]] Vector3<Metre, Body> foot_in_body(const LegChain& leg, const JointAngles<>& angle) noexcept;

/// Vertical distance from the lowest foot up to the trunk frame's origin, m. `up`: unit vector in the body
/// frame. NaN when an angle or a length is; with no legs, minus infinity: both count as too low.
[[nodiscard]] double base_height(const Limits& limits, const JointAngles<>& angle,
                                 const Vector3<Metre, Body>& up) noexcept;

}  // namespace pastern::safety
