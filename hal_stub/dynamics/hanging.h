// A load that hangs from the trunk by a strap and swings: a point mass on a stiff, damped strap that can only
// pull. Its force is linearly implicit in the trunk's velocity, with the load's own motion eliminated, so it
// enters the trunk's equations like a contact (contact.h) and the arrow stays; momentum is kept to rounding.
#pragma once

#include "hal_stub/dynamics/contact.h"

namespace pastern::stub {

/// Of the site. All zero: nothing hangs.
template <class S>
struct Hanging {
  Vec3<S> at{S(0), S(0), S(0)};  ///< where the strap is held, trunk frame, m
  S length{};                    ///< of the slack strap, m
  S stiffness{};                 ///< N/m
  S along{};                     ///< N s/m, of the strap
  S across{};                    ///< N s/m, of the swing
  S inverse_mass{};              ///< 1/kg
};

/// What the load does to the trunk in a step: Touch along `line`, from where the strap is held to the load.
template <class S>
struct Tow {
  Touch<S> touch;
  Vec3<S> line;
};

/// With e the stretch, s the rate of it, a = k dt + c and 1/m the load's: s' = s + dt n.g - dt T/m - n.(v' -
/// v) of the trunk's point, T = k e + a s', solved for T; across the strap the same with k = 0. A slack strap
/// does nothing.
template <class S>
inline Tow<S> tow_of(const Hanging<S>& load, Constant<S> dt, const Swing<S>& swing, const Vec3<S>& rate,
                     const Work<S>& work) noexcept {
  using C = Constant<S>;
  const S one(C(1));
  const Vec3<S> arm = turn_back(work.body, swing.place) - load.at;
  const S length = sqrt(max(dot(arm, arm), S(C(1e-12))));
  const Vec3<S> line = arm * (one / length);
  const Vec3<S> apart =
      turn_back(work.body, swing.velocity) + work.gravity * S(dt) - work.velocity - cross(rate, load.at);
  const S stretch = length - load.length;
  const S drawn = dot(apart, line);
  const S a = load.stiffness * dt + load.along;
  const S along = a * (one / (one + a * load.inverse_mass * dt));
  const S pull = (load.stiffness * stretch + a * drawn) * (one / (one + a * load.inverse_mass * dt));
  const S across = load.across * (one / (one + load.across * load.inverse_mass * dt));
  const auto taut = (stretch > S(0)) & (pull > S(0));
  const Vec3<S> force = line * pull + (apart - line * drawn) * across;
  const S zero(0);
  const auto held = [&](const S& number) { return select(taut, number, zero); };
  return {{{held(force.x), held(force.y), held(force.z)}, held(across), held(along - across)}, line};
}

/// Before solving.
template <class S>
inline void hang(const Hanging<S>& load, Constant<S> dt, const BodyState<S>& state, Work<S>& work) noexcept {
  const Tow<S> tow = tow_of(load, dt, state.swing, state.rate, work);
  press_trunk(tow.touch, tow.line, load.at, dt, work);
}

/// After solving, before the trunk is moved: the load takes the same force the other way.
template <class S>
inline void swing(const Hanging<S>& load, Constant<S> dt, const Work<S>& work, BodyState<S>& state) noexcept {
  const Tow<S> tow = tow_of(load, dt, state.swing, state.rate, work);
  const auto* a = work.acceleration;
  const Vec3<S> origin = Vec3<S>{a[3], a[4], a[5]} * S(dt);
  const Vec3<S> gain = origin + cross(Vec3<S>{a[0], a[1], a[2]}, load.at) * S(dt);
  const Vec3<S> force = tow.touch.force - resisted(tow.touch, tow.line, gain);
  const Vec3<S> fall = (work.gravity - force * load.inverse_mass) * S(dt);
  state.swing.velocity = state.swing.velocity + work.body * fall;
  const Vec3<S> trunk = state.velocity + work.body * origin;
  state.swing.place = state.swing.place + (state.swing.velocity - trunk) * S(dt);
}

}  // namespace pastern::stub
