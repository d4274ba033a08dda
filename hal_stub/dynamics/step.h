// One step of the body: inertia and bias, drives and end stops, contacts, solve, integrate (semi-implicit
// Euler, first order). The trunk's velocity is kept in world axes, so that linear momentum has no drift of
// its own.
#pragma once

#include "hal_stub/dynamics/contact.h"
#include "hal_stub/dynamics/hanging.h"
#include "hal_stub/dynamics/solve.h"

namespace pastern::stub {

/// Everything outside the body that acts in a step.
template <class S>
struct Surroundings {
  Ground<S> ground;
  TrunkFigures<S> trunk{};
  Vec3<S> push{S(0), S(0), S(0)};  ///< force on the trunk's centre of mass, world axes, N
  Hanging<S> hanging{};
  bool hangs{false};  ///< a load does
};

/// Torques and end stops of a chain of hinges.
template <class S>
inline void load_leg(const Tree<Constant<S>>& tree, std::size_t n, const BodyState<S>& state,
                     const Loads<S>& loads, Constant<S> dt, LegWork<S>& leg) noexcept {
  const S zero(0);
  const Constant<S> along = tree.stop_stiffness * dt + tree.stop_damping;
  const int count = tree.leg[n].joint_count;
  for (int i = 0; i < count; ++i) {
    const auto k = static_cast<std::size_t>(i);
    const auto& joint = tree.leg[n].joint[k];
    const S& angle = state.angle[n][k];
    const S over = max(angle - joint.angle_max, zero) + min(angle - joint.angle_min, zero);
    const S along_here = select(abs(over) > zero, S(along), zero);
    leg.force[k] =
        leg.force[k] + loads[n][k].torque - over * tree.stop_stiffness - along_here * state.speed[n][k];
    leg.inertia[i][i] = leg.inertia[i][i] + loads[n][k].inertia + along_here * dt;
  }
}

template <class S>
inline void add_loads(const Tree<Constant<S>>& tree, const BodyState<S>& state, const Loads<S>& loads,
                      Constant<S> dt, Work<S>& work) noexcept {
  for (int l = 0; l < tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    if (tree.leg[n].general) {
      load_limb(tree, n, state, loads, dt, work.leg[n]);
    } else {
      load_leg(tree, n, state, loads, dt, work.leg[n]);
    }
  }
}

template <class S>
inline void add_push(const Surroundings<S>& around, Work<S>& work) noexcept {
  const Vec3<S> f = turn_back(work.body, around.push);
  const Vec3<S> m = cross(around.trunk.centre, f);
  const S more[6] = {m.x, m.y, m.z, f.x, f.y, f.z};
  for (int i = 0; i < 6; ++i) work.force[i] = work.force[i] + more[i];
}

/// A ball on a leg that may touch.
template <class S>
struct Spot {
  Vec3<S> centre;  ///< trunk axes
  Constant<S> radius;
  std::size_t leg;
  std::size_t point;
};

template <class On, class S>
inline Lie<S> lie_of(const On& on, const Spot<S>& spot) noexcept {
  return lie_of(on, spot.centre, S(spot.radius));
}

/// One point of a leg of K joints.
template <int K, class On, class S>
inline void press_point(const On& on, const Spot<S>& spot, const BodyState<S>& state,
                        Work<S>& work) noexcept {
  const Lie<S> lie = lie_of(on, spot);
  if (!any(lie.depth > S(0))) return;
  LegWork<S>& leg = work.leg[spot.leg];
  const Vec3<S> r = spot.centre - lie.normal * S(spot.radius);
  const auto arm = arms_of<K>(leg, r);
  const Vec3<S> velocity = velocity_at<K>(work, state.rate, r, arm, state.speed[spot.leg]);
  const Touch<S> touch = touch_of(on, lie, velocity, state.grip.leg[spot.leg][spot.point]);
  press_leg<K>(touch, lie.normal, r, arm, on.dt, leg);
  press_trunk(touch, lie.normal, r, on.dt, work);
}

template <int K, class On, class S>
inline void grip_point(const On& on, const Spot<S>& spot, const Work<S>& work, BodyState<S>& state) noexcept {
  const Lie<S> lie = lie_of(on, spot);
  S& grip = state.grip.leg[spot.leg][spot.point];
  if (!any(lie.depth > S(0))) {
    grip = S(0);
    return;
  }
  const LegWork<S>& leg = work.leg[spot.leg];
  const Vec3<S> r = spot.centre - lie.normal * S(spot.radius);
  const auto arm = arms_of<K>(leg, r);
  PerChain<S> speed = state.speed[spot.leg];
  for (std::size_t i = 0; i < K; ++i) speed[i] = speed[i] + leg.acceleration[i] * on.dt;
  const auto* a = work.acceleration;
  const Vec3<S> turning{a[0], a[1], a[2]};
  const Vec3<S> moving{a[3], a[4], a[5]};
  const Vec3<S> after =
      velocity_at<K>(work, state.rate + turning * S(on.dt), r, arm, speed) + moving * S(on.dt);
  grip = grip_after(on, lie.depth, dot(after, lie.normal));
}

/// Foot and knee of leg `n` of K joints: press (before solving) or grip (after).
template <bool kPress, int K, class On, class S>
inline void touch_leg(const LegFigures<Constant<S>>& leg, std::size_t n, const On& on, BodyState<S>& state,
                      Work<S>& work) noexcept {
  const Spot<S> foot{work.leg[n].foot, leg.foot_radius, n, 0};
  const Spot<S> knee{work.leg[n].place[K - 1], leg.knee_radius, n, 1};
  if constexpr (kPress) {
    press_point<K>(on, foot, state, work);
    if (leg.knee) press_point<K>(on, knee, state, work);
  } else {
    grip_point<K>(on, foot, work, state);
    if (leg.knee) grip_point<K>(on, knee, work, state);
  }
}

template <bool kPress, class On, class S>
inline void touch_legs(const Tree<Constant<S>>& tree, const On& on, BodyState<S>& state,
                       Work<S>& work) noexcept {
  for (int l = 0; l < tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    const auto& leg = tree.leg[n];
    for_limb(leg, [&]<int K>() {
      if constexpr (K > 0) {
        touch_leg<kPress, K>(leg, n, on, state, work);
      } else if constexpr (kPress) {
        press_limb(leg, n, on, state, work);
      } else {
        grip_limb(leg, n, on, state, work);
      }
    });
  }
}

/// How high the ground may rise over its plane.
template <class S>
inline S top_of(const PlainFooting<S>&) noexcept {
  return S(0);
}
template <class S>
inline S top_of(const ShapedFooting<S>& on) noexcept {
  return on.ground.relief.top;
}

/// Mask: a corner of the trunk may touch.
template <class S>
inline auto trunk_near(const Tree<Constant<S>>& tree, const Below<S>& below, const S& top) noexcept {
  const S reach = abs(below.normal.x) * tree.half_size.x + abs(below.normal.y) * tree.half_size.y +
                  abs(below.normal.z) * tree.half_size.z;
  return below.height < reach + top;
}

template <bool kPress, class On, class S>
inline void touch_trunk(const Tree<Constant<S>>& tree, const On& on, BodyState<S>& state,
                        Work<S>& work) noexcept {
  if (!any(trunk_near(tree, on.below, top_of(on)))) {
    if constexpr (!kPress) state.grip.corner.fill(S(0));
    return;
  }
  const auto* a = work.acceleration;
  for (std::size_t c = 0; c < kTrunkCorners; ++c) {
    const Vec3<S> r = spread<S>(tree.corner[c]);
    const Lie<S> lie = lie_of(on, r, S(0));
    const Vec3<S> velocity = work.velocity + cross(state.rate, r);
    if constexpr (kPress) {
      if (!any(lie.depth > S(0))) continue;
      press_trunk(touch_of(on, lie, velocity, state.grip.corner[c]), lie.normal, r, on.dt, work);
    } else {
      const Vec3<S> gain = Vec3<S>{a[3], a[4], a[5]} + cross(Vec3<S>{a[0], a[1], a[2]}, r);
      const S speed = dot(velocity + gain * S(on.dt), lie.normal);
      state.grip.corner[c] = grip_after(on, lie.depth, speed);
    }
  }
}

/// Contacts of legs and trunk: press (before solving) or grip (after).
template <bool kPress, class S>
inline void touch_ground(const Tree<Constant<S>>& tree, const Ground<S>& ground, const Below<S>& below,
                         Constant<S> dt, BodyState<S>& state, Work<S>& work) noexcept {
  const auto touch = [&](const auto& on) {
    touch_legs<kPress>(tree, on, state, work);
    touch_trunk<kPress>(tree, on, state, work);
  };
  if (ground.plain) {
    touch(PlainFooting<S>{ground, below, dt});
  } else {
    touch(ShapedFooting<S>{ground, below, stand_of(ground, work.body, state.position), dt});
  }
}

/// The trunk's new velocity, then its new place with it.
template <class S>
inline void integrate_trunk(Constant<S> dt, const Work<S>& work, BodyState<S>& state) noexcept {
  const auto* a = work.acceleration;
  state.rate = state.rate + Vec3<S>{a[0], a[1], a[2]} * S(dt);
  state.velocity = state.velocity + work.body * Vec3<S>{a[3], a[4], a[5]} * S(dt);
  state.position = state.position + state.velocity * S(dt);
  state.attitude = turned_by(state.attitude, state.rate * S(dt));
}

/// New speeds, then new places with the new speeds.
template <class S>
inline void integrate(const Tree<Constant<S>>& tree, Constant<S> dt, const Work<S>& work,
                      BodyState<S>& state) noexcept {
  integrate_trunk(dt, work, state);
  for (int l = 0; l < tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[n].joint_count); ++i) {
      state.speed[n][i] = state.speed[n][i] + work.leg[n].acceleration[i] * dt;
      state.angle[n][i] = state.angle[n][i] + state.speed[n][i] * dt;
    }
  }
}

/// One step of `dt` seconds. `work` holds this step's accelerations afterwards ([angular; linear] of the
/// trunk's origin in trunk axes, gravity included), which is what an IMU feels.
template <bool kMade = false, class S>
inline void step_body(const Tree<Constant<S>>& tree, const Surroundings<S>& around, const Loads<S>& loads,
                      Constant<S> dt, BodyState<S>& state, Work<S>& work) noexcept {
  begin_step<kMade>(tree, around.trunk, state, work);
  add_loads(tree, state, loads, dt, work);
  add_push(around, work);
  if (!kMade && around.hangs) hang(around.hanging, dt, state, work);
  const Below<S> below = below_of(around.ground, work.body, state.position);
  touch_ground<true>(tree, around.ground, below, dt, state, work);
  solve(tree, work);
  touch_ground<false>(tree, around.ground, below, dt, state, work);
  if (!kMade && around.hangs) swing(around.hanging, dt, work, state);
  integrate(tree, dt, work, state);
}

}  // namespace pastern::stub
