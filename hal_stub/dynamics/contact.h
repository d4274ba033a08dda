// Ground contact of points, linearly implicit: the normal force at the end of the step is k (d - dt vn') - c
// vn', the friction force -b vt' with b = mu N / max(|vt|, stick speed) and N of the step before. Both enter
// the matrix through each point's own Jacobian, so the arrow stays; stable far beyond the explicit limit.
#pragma once

#include "hal_stub/dynamics/ground.h"
#include "hal_stub/dynamics/motion.h"

namespace pastern::stub {

/// What a point does in this step: force f = push - B v', B = along n n' + across (1 - n n'), all zero when
/// it is free.
template <class S>
struct Touch {
  Vec3<S> force;  ///< with this step's velocity
  S across;       ///< N s/m
  S excess;       ///< along - across
};

/// `grip`: normal force of the step before. `On`: PlainFooting or ShapedFooting.
template <class On, class S>
inline Touch<S> touch_of(const On& on, const Lie<S>& lie, const Vec3<S>& velocity, const S& grip) noexcept {
  using C = Constant<S>;
  const auto& ground = on.ground;
  const auto& normal = lie.normal;
  const S along = ground.stiffness * on.dt + damping_at(on, lie.depth);
  const S normal_speed = dot(velocity, normal);
  const S push = ground.stiffness * lie.depth - along * normal_speed;
  const auto free = !((lie.depth > S(0)) & (push > S(0)));
  const Vec3<S> slide = velocity - normal * normal_speed;
  const S sliding = sqrt(dot(slide, slide));
  const S speed = max(sliding, ground.stick_speed);
  const S friction = friction_at(on, lie.friction, sliding);
  const S across = select(free, S(0), friction * grip * (C(1) / speed));
  const S held = select(free, S(0), push);
  return {normal * held - slide * across, across, select(free, S(0), along) - across};
}

/// B applied to a vector.
template <class S>
inline Vec3<S> resisted(const Touch<S>& touch, const Vec3<S>& normal, const Vec3<S>& a) noexcept {
  return a * touch.across + normal * (touch.excess * dot(normal, a));
}

/// Adds the point's force at `r` (trunk axes) and dt J'BJ to the trunk's own block.
template <class S>
inline void press_trunk(const Touch<S>& touch, const Vec3<S>& normal, const Vec3<S>& r, Constant<S> dt,
                        Work<S>& work) noexcept {
  const Vec3<S> moment = cross(r, touch.force);
  work.force[0] = work.force[0] + moment.x;
  work.force[1] = work.force[1] + moment.y;
  work.force[2] = work.force[2] + moment.z;
  work.force[3] = work.force[3] + touch.force.x;
  work.force[4] = work.force[4] + touch.force.y;
  work.force[5] = work.force[5] + touch.force.z;
  const S b = touch.across * dt;
  const S g = touch.excess * dt;
  const Vec3<S> rn = cross(r, normal);
  const S n[6] = {rn.x, rn.y, rn.z, normal.x, normal.y, normal.z};
  auto& a = work.inertia;
  for (int i = 0; i < 6; ++i) {
    const S gn = g * n[i];
    for (int k = 0; k <= i; ++k) a[i][k] = a[i][k] + gn * n[k];
  }
  const S br[3] = {b * r.x, b * r.y, b * r.z};
  const S rr = dot(r, Vec3<S>{br[0], br[1], br[2]});
  a[0][0] = a[0][0] + rr - br[0] * r.x;
  a[1][1] = a[1][1] + rr - br[1] * r.y;
  a[2][2] = a[2][2] + rr - br[2] * r.z;
  a[1][0] = a[1][0] - br[0] * r.y;
  a[2][0] = a[2][0] - br[0] * r.z;
  a[2][1] = a[2][1] - br[1] * r.z;
  a[3][3] = a[3][3] + b;
  a[4][4] = a[4][4] + b;
  a[5][5] = a[5][5] + b;
  // Linear rows: b [r]' as in the moment of inertia's coupling.
  a[3][1] = a[3][1] + br[2];
  a[3][2] = a[3][2] - br[1];
  a[4][0] = a[4][0] - br[2];
  a[4][2] = a[4][2] + br[0];
  a[5][0] = a[5][0] + br[1];
  a[5][1] = a[5][1] - br[0];
}

/// Columns of a leg point's Jacobian for the first K joints, trunk axes.
template <int K, class S>
inline std::array<Vec3<S>, K> arms_of(const LegWork<S>& leg, const Vec3<S>& r) noexcept {
  std::array<Vec3<S>, K> arm{};
  for (std::size_t i = 0; i < K; ++i) arm[i] = cross(leg.axis[i], r - leg.place[i]);
  return arm;
}

/// Velocity of a point of a leg, trunk axes.
template <int K, class S>
inline Vec3<S> velocity_at(const Work<S>& work, const Vec3<S>& rate, const Vec3<S>& r,
                           const std::array<Vec3<S>, K>& arm, const PerChain<S>& speed) noexcept {
  Vec3<S> v = work.velocity + cross(rate, r);
  for (std::size_t i = 0; i < K; ++i) v = v + arm[i] * speed[i];
  return v;
}

template <int K, class S>
inline void press_leg(const Touch<S>& touch, const Vec3<S>& normal, const Vec3<S>& r,
                      const std::array<Vec3<S>, K>& arm, Constant<S> dt, LegWork<S>& leg) noexcept {
  for (int i = 0; i < K; ++i) {
    const auto n = static_cast<std::size_t>(i);
    const Vec3<S> w = resisted(touch, normal, arm[n]) * S(dt);
    leg.force[n] = leg.force[n] + dot(arm[n], touch.force);
    for (int j = 0; j <= i; ++j)
      leg.inertia[i][j] = leg.inertia[i][j] + dot(arm[static_cast<std::size_t>(j)], w);
    leg.turning[n] = leg.turning[n] + cross(r, w);
    leg.moving[n] = leg.moving[n] + w;
  }
}

/// Normal force at the end of the step, from the speed along the normal then.
template <class On, class S>
inline S grip_after(const On& on, const S& depth, const S& normal_speed) noexcept {
  const S push = on.ground.stiffness * (depth - normal_speed * on.dt) - damping_at(on, depth) * normal_speed;
  return select(depth > S(0), max(push, S(0)), S(0));
}

}  // namespace pastern::stub
