// Limbs of the general kind: they branch, slide, or touch the ground with more points than a foot and a knee.
// The same block of the arrow, with parents by index instead of the joint before, and lengths known at run
// time. A limb's joints stand with parents before children; row and column of joints of different branches
// meet in a zero, which elimination keeps where it can (Featherstone, Rigid Body Dynamics Algorithms (2008),
// ch. 6; from memory).
#pragma once

#include "hal_stub/dynamics/contact.h"

namespace pastern::stub {

/// Whether joint `i` moves what joint `k` carries.
template <class C>
inline bool on_line(const LegFigures<C>& limb, int i, int k) noexcept {
  return ((limb.joint[static_cast<std::size_t>(k)].line >> static_cast<unsigned>(i)) & 1U) != 0;
}

/// The frame that a hinge or a slide carries. A slide's origin moves along the axis; seen from the turning
/// base that adds 2 rate x speed (Coriolis).
template <class S>
inline Frame<S> carried(const Frame<S>& base, const JointFigures<Constant<S>>& joint, const S& angle,
                        const S& speed, const Vec3<S>& axis) noexcept {
  Frame<S> frame = base;
  Vec3<S> step = turn(base.axes, joint.origin);
  if (joint.slides) {
    step = step + axis * angle;
    frame.linear = accelerated(base, step) + cross(base.rate, axis * speed) * S(Constant<S>(2));
    frame.place = base.place + step;
    return frame;
  }
  const Vec3<S> spin = axis * speed;
  frame.linear = accelerated(base, step);
  frame.place = base.place + step;
  frame.angular = base.angular + cross(base.rate, spin);
  frame.rate = base.rate + spin;
  frame.axes = turned(base.axes, joint, sin_cos(angle));
  return frame;
}

/// From the trunk outward: places, axes, points and each link's heap.
template <class S>
inline void go_out_limb(const LegFigures<Constant<S>>& limb, const PerChain<S>& angle,
                        const PerChain<S>& speed, const Frame<S>& trunk, LegWork<S>& work,
                        std::array<Heap<S>, kMaxLimb>& heap) noexcept {
  std::array<Frame<S>, kMaxLimb> frame;
  for (std::size_t i = 0; i < static_cast<std::size_t>(limb.joint_count); ++i) {
    const auto& joint = limb.joint[i];
    const Frame<S>& base = joint.parent < 0 ? trunk : frame[static_cast<std::size_t>(joint.parent)];
    const Vec3<S> axis = axis_of(base.axes, joint);
    frame[i] = carried(base, joint, angle[i], speed[i], axis);
    const Frame<S>& f = frame[i];
    const Vec3<S> arm = turn(f.axes, joint.link.centre);
    heap[i] = heap_of(joint.link.mass, f.place + arm, turned_inertia(f.axes, joint.link), f.rate, f.angular,
                      accelerated(f, arm));
    work.place[i] = f.place;
    work.axis[i] = joint.slides ? zero3<S>() : axis;
    work.slide[i] = joint.slides ? axis : cross(f.place, axis);
  }
  for (std::size_t p = 0; p < static_cast<std::size_t>(limb.point_count); ++p) {
    const auto& point = limb.point[p];
    const Frame<S>& f = frame[static_cast<std::size_t>(point.joint)];
    work.point[p] = f.place + turn(f.axes, point.at);
  }
  work.foot = work.point[0];
}

/// From the tips to the trunk: composite bodies, the limb's inertia block, its coupling and its bias.
template <class S>
inline void come_back_limb(const LegFigures<Constant<S>>& limb, LegWork<S>& work,
                           std::array<Heap<S>, kMaxLimb>& heap, Heap<S>& total) noexcept {
  for (int i = limb.joint_count - 1; i >= 0; --i) {
    const auto n = static_cast<std::size_t>(i);
    const Heap<S>& beyond = heap[n];
    const Vec3<S>& axis = work.axis[n];
    const Vec3<S>& slide = work.slide[n];
    const Vec3<S> moving = slide * beyond.mass + cross(axis, beyond.moment);
    const Vec3<S> turning = beyond.inertia * axis + cross(beyond.moment, slide);
    work.moving[n] = moving;
    work.turning[n] = turning;
    work.force[n] = S(0) - (dot(axis, beyond.torque) + dot(slide, beyond.force));
    for (int j = 0; j <= i; ++j) {
      const auto m = static_cast<std::size_t>(j);
      work.inertia[i][j] =
          on_line(limb, j, i) ? dot(work.axis[m], turning) + dot(work.slide[m], moving) : S(0);
    }
    const int parent = limb.joint[n].parent;
    add(parent < 0 ? total : heap[static_cast<std::size_t>(parent)], beyond);
  }
}

template <class S>
inline void pass_limb(const LegFigures<Constant<S>>& limb, const PerChain<S>& angle, const PerChain<S>& speed,
                      const Frame<S>& trunk, LegWork<S>& work, Heap<S>& total,
                      const PerChain<S>* ratio) noexcept {
  std::array<Heap<S>, kMaxLimb> heap;
  go_out_limb(limb, angle, speed, trunk, work, heap);
  for (std::size_t i = 0; ratio != nullptr && i < static_cast<std::size_t>(limb.joint_count); ++i) {
    weigh((*ratio)[i], heap[i]);
  }
  come_back_limb(limb, work, heap, total);
}

/// Columns of a point's Jacobian, zero for joints that do not move it; trunk axes.
template <class S>
inline std::array<Vec3<S>, kMaxLimb> limb_arms(const LegFigures<Constant<S>>& limb, int joint,
                                               const LegWork<S>& work, const Vec3<S>& r) noexcept {
  std::array<Vec3<S>, kMaxLimb> arm;
  for (int i = 0; i < limb.joint_count; ++i) {
    const auto n = static_cast<std::size_t>(i);
    arm[n] = on_line(limb, i, joint) ? cross(work.axis[n], r) + work.slide[n] : zero3<S>();
  }
  return arm;
}

/// Velocity of a point of a limb, trunk axes.
template <class S>
inline Vec3<S> limb_velocity(const LegFigures<Constant<S>>& limb, const Work<S>& work, const Vec3<S>& rate,
                             const Vec3<S>& r, const std::array<Vec3<S>, kMaxLimb>& arm,
                             const PerChain<S>& speed) noexcept {
  Vec3<S> v = work.velocity + cross(rate, r);
  for (std::size_t i = 0; i < static_cast<std::size_t>(limb.joint_count); ++i) v = v + arm[i] * speed[i];
  return v;
}

template <class On, class S>
inline void press_limb(const LegFigures<Constant<S>>& limb, std::size_t l, const On& on, BodyState<S>& state,
                       Work<S>& work) noexcept {
  LegWork<S>& leg = work.leg[l];
  for (std::size_t p = 0; p < static_cast<std::size_t>(limb.point_count); ++p) {
    const S radius(limb.point[p].radius);
    const Lie<S> lie = lie_of(on, leg.point[p], radius);
    if (!any(lie.depth > S(0))) continue;
    const Vec3<S> r = leg.point[p] - lie.normal * radius;
    const auto arm = limb_arms(limb, limb.point[p].joint, leg, r);
    const Vec3<S> velocity = limb_velocity(limb, work, state.rate, r, arm, state.speed[l]);
    const Touch<S> touch = touch_of(on, lie, velocity, grip_of(state.grip, l, p));
    for (int i = 0; i < limb.joint_count; ++i) {
      const auto n = static_cast<std::size_t>(i);
      if (!on_line(limb, i, limb.point[p].joint)) continue;
      const Vec3<S> w = resisted(touch, lie.normal, arm[n]) * S(on.dt);
      leg.force[n] = leg.force[n] + dot(arm[n], touch.force);
      for (int j = 0; j <= i; ++j) {
        leg.inertia[i][j] = leg.inertia[i][j] + dot(arm[static_cast<std::size_t>(j)], w);
      }
      leg.turning[n] = leg.turning[n] + cross(r, w);
      leg.moving[n] = leg.moving[n] + w;
    }
    press_trunk(touch, lie.normal, r, on.dt, work);
  }
}

template <class On, class S>
inline void grip_limb(const LegFigures<Constant<S>>& limb, std::size_t l, const On& on, BodyState<S>& state,
                      const Work<S>& work) noexcept {
  const LegWork<S>& leg = work.leg[l];
  PerChain<S> speed = state.speed[l];
  for (std::size_t i = 0; i < static_cast<std::size_t>(limb.joint_count); ++i) {
    speed[i] = speed[i] + leg.acceleration[i] * on.dt;
  }
  const auto* a = work.acceleration;
  const Vec3<S> rate = state.rate + Vec3<S>{a[0], a[1], a[2]} * S(on.dt);
  const Vec3<S> moved = Vec3<S>{a[3], a[4], a[5]} * S(on.dt);
  for (std::size_t p = 0; p < static_cast<std::size_t>(limb.point_count); ++p) {
    const S radius(limb.point[p].radius);
    const Lie<S> lie = lie_of(on, leg.point[p], radius);
    S& grip = grip_of(state.grip, l, p);
    if (!any(lie.depth > S(0))) {
      grip = S(0);
      continue;
    }
    const Vec3<S> r = leg.point[p] - lie.normal * radius;
    const auto arm = limb_arms(limb, limb.point[p].joint, leg, r);
    const Vec3<S> after = limb_velocity(limb, work, rate, r, arm, speed) + moved;
    grip = grip_after(on, lie.depth, dot(after, lie.normal));
  }
}

/// Torques and end stops; a slide's stop is another spring.
template <class S>
inline void load_limb(const Tree<Constant<S>>& tree, std::size_t l, const BodyState<S>& state,
                      const Loads<S>& loads, Constant<S> dt, LegWork<S>& leg) noexcept {
  const S zero(0);
  for (int i = 0; i < tree.leg[l].joint_count; ++i) {
    const auto k = static_cast<std::size_t>(i);
    const auto& joint = tree.leg[l].joint[k];
    const Constant<S> stiffness = joint.slides ? tree.slide_stiffness : tree.stop_stiffness;
    const Constant<S> along = stiffness * dt + (joint.slides ? tree.slide_damping : tree.stop_damping);
    const S& angle = state.angle[l][k];
    const S over = max(angle - joint.angle_max, zero) + min(angle - joint.angle_min, zero);
    const S here = select(abs(over) > zero, S(along), zero);
    leg.force[k] = leg.force[k] + loads[l][k].torque - over * stiffness - here * state.speed[l][k];
    leg.inertia[i][i] = leg.inertia[i][i] + loads[l][k].inertia + here * dt;
  }
}

}  // namespace pastern::stub
