// What happens in one period around the step of the body, joint by joint and over the scalar S: the drives'
// own correction of a command, sensors' errors, the rule of falls. The simulated robot and walks in lanes use
// the same. Nothing here holds state.
#pragma once

#include <cmath>
#include <numbers>

#include "hal_stub/robot/robot_state.h"

namespace pastern::stub {

inline constexpr double kFallTilt = 34.0 * std::numbers::pi / 180;  ///< rad, from vertical

/// Into +-most; what is not a number becomes 0.
template <class S>
inline S bounded(const S& torque, const S& most) noexcept {
  const S low = select(torque < -most, -most, S(0));
  return select(torque > most, most, select(torque >= -most, torque, low));
}

/// A joint as a frame, or the drive's own encoder, has it.
template <class S>
struct Seen {
  S angle;
  S speed;
};

/// How a drive holds to what it was told.
template <class C>
struct Hold {
  C stiffness;  ///< N m/rad
  C damping;    ///< N m s/rad
  C most;       ///< N m, the gate's peak: no correction goes beyond
};

/// The torque that a drive makes of a command that answered the joint as `then`, with the joint as it is
/// `now`.
template <class S>
inline S corrected(const Hold<Constant<S>>& hold, const S& torque, const Seen<S>& then,
                   const Seen<S>& now) noexcept {
  return bounded(torque + hold.stiffness * (then.angle - now.angle) + hold.damping * (then.speed - now.speed),
                 S(hold.most));
}

/// The same in two halves, for many commands on their way: what the command is worth at angle and speed zero,
/// one number instead of three ...
template <class S>
inline S folded(const Hold<Constant<S>>& hold, const S& torque, const Seen<S>& then) noexcept {
  return torque + hold.stiffness * then.angle + hold.damping * then.speed;
}
/// ... and the torque where the joint is now. Equal to corrected() but for rounding.
template <class S>
inline S unfolded(const Hold<Constant<S>>& hold, const S& command, const Seen<S>& now) noexcept {
  return bounded(command - hold.stiffness * now.angle - hold.damping * now.speed, S(hold.most));
}

/// The nearest step of an encoder; `per_step` = 1 / step.
template <class S>
inline S quantised(const S& angle, Constant<S> step, Constant<S> per_step) noexcept {
  return round_even(angle * per_step) * step;
}

/// Into +-range; what is not a number stays.
template <class S>
inline S saturated(const S& value, const S& range) noexcept {
  return select(value < -range, -range, select(range < value, range, value));
}

/// Mask: a part other than a foot touches the ground.
template <class S>
inline auto lies(const Tree<Constant<S>>& tree, const Grip<S>& grip) noexcept {
  auto down = grip.corner[0] > S(0);
  for (const S& corner : grip.corner) down = down | (corner > S(0));
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    const auto& limb = tree.leg[l];
    if (!limb.general) {
      down = down | (grip.leg[l][1] > S(0));
      if (!limb.stands) down = down | (grip.leg[l][0] > S(0));
      continue;
    }
    for (std::size_t p = 0; p < static_cast<std::size_t>(limb.point_count); ++p) {
      if (!limb.point[p].foot) down = down | (grip_of(grip, l, p) > S(0));
    }
  }
  return down;
}

/// Mask: the body axis more than kFallTilt from vertical, the trunk under half its stance's height over the
/// ground, a part other than a foot on the ground, or any of it not a number.
template <class S>
inline auto fallen(const Tree<Constant<S>>& tree, const Ground<S>& ground, Constant<S> stance_height,
                   const BodyState<S>& body) noexcept {
  using C = Constant<S>;
  const S upright = C(1) - C(2) * (body.attitude.x * body.attitude.x + body.attitude.y * body.attitude.y);
  const S height = height_over(ground, body.position);
  const auto up = (upright > S(C(std::cos(kFallTilt)))) & (height > S(stance_height / C(2)));
  return (!up) | lies(tree, body.grip);
}

}  // namespace pastern::stub
