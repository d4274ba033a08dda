// State of a body, and its joint-space inertia and bias forces by composite bodies, all written in trunk axes
// about the trunk frame's origin. The trunk's six coordinates are [angular; linear acceleration of that
// origin], so a joint's column of the coupling is the momentum of the composite body beyond it for unit joint
// speed. Source of the method: Featherstone, Rigid Body Dynamics Algorithms (2008), ch. 5 and 6 (from
// memory); the bias by Newton-Euler with the trunk's acceleration set to minus gravity.
#pragma once

#include <array>

#include "hal_stub/dynamics/tree.h"

namespace pastern::stub {

template <class S>
using PerChain = std::array<S, kMaxLimb>;

/// Contact normal force of the last step, N: friction lags by one step so that a step stays linear.
template <class S>
struct Grip {
  std::array<std::array<S, kPointsPerLeg>, kMaxTreeLegs> leg{};
  std::array<S, kTrunkCorners> corner{};
  std::array<std::array<S, kMaxPoints - kPointsPerLeg>, kMaxTreeLegs>
      more{};  ///< of limbs of the general kind
};

/// Point `p` of limb `l`.
template <class S>
inline S& grip_of(Grip<S>& grip, std::size_t l, std::size_t p) noexcept {
  return p < kPointsPerLeg ? grip.leg[l][p] : grip.more[l][p - kPointsPerLeg];
}
template <class S>
inline const S& grip_of(const Grip<S>& grip, std::size_t l, std::size_t p) noexcept {
  return p < kPointsPerLeg ? grip.leg[l][p] : grip.more[l][p - kPointsPerLeg];
}

/// Where a load is that hangs from the trunk (hanging.h).
template <class S>
struct Swing {
  Vec3<S> place{S(0), S(0), S(0)};     ///< from the trunk's origin, world axes, m
  Vec3<S> velocity{S(0), S(0), S(0)};  ///< world axes, m/s
};

template <class S>
struct BodyState {
  Quat<S> attitude{S(1), S(0), S(0), S(0)};  ///< trunk to world
  Vec3<S> position{S(0), S(0), S(0)};        ///< of the trunk frame's origin, world, m
  Vec3<S> velocity{S(0), S(0), S(0)};        ///< of that point, world axes, m/s
  Vec3<S> rate{S(0), S(0), S(0)};            ///< trunk axes, rad/s
  std::array<PerChain<S>, kMaxTreeLegs> angle{};
  std::array<PerChain<S>, kMaxTreeLegs> speed{};
  Grip<S> grip{};
  Swing<S> swing{};
};

/// Of one leg in this step, trunk axes.
template <class S>
struct LegWork {
  std::array<Vec3<S>, kMaxLimb> axis;
  std::array<Vec3<S>, kMaxLimb> place;    ///< of the joints
  Vec3<S> foot;                           ///< centre of the foot's ball
  S inertia[kMaxLimb][kMaxLimb];          ///< lower triangle
  std::array<Vec3<S>, kMaxLimb> turning;  ///< coupling to the trunk, angular
  std::array<Vec3<S>, kMaxLimb> moving;   ///< linear
  PerChain<S> force;                      ///< right-hand side: what accelerates the joint, N m
  S forward[kMaxLimb][6];                 ///< of the elimination
  PerChain<S> inverse;                    ///< of its diagonal
  PerChain<S> acceleration;
  // Of limbs of the general kind; their axis is zero where a joint slides:
  std::array<Vec3<S>, kMaxLimb> slide;    ///< velocity of the trunk's origin as part of the link
  std::array<Vec3<S>, kMaxPoints> point;  ///< centres
};

/// Scratch of one step, allocated once by whoever steps.
template <class S>
struct Work {
  Rotation<S> body;  ///< trunk to world
  Vec3<S> velocity;  ///< of the trunk's origin, trunk axes
  Vec3<S> gravity;   ///< trunk axes, m/s2
  std::array<LegWork<S>, kMaxTreeLegs> leg;
  S inertia[6][6];    ///< of the trunk with all legs, lower triangle
  S force[6];         ///< right-hand side, [moment about the origin; force]
  S acceleration[6];  ///< [angular; linear], trunk axes
};

/// What the drives do to a joint in a step: torque now, and what the step's own change of speed adds to the
/// diagonal (rotor inertia + dt * viscosity).
template <class S>
struct JointLoad {
  S torque;
  S inertia;
};
template <class S>
using Loads = std::array<std::array<JointLoad<S>, kMaxLimb>, kMaxTreeLegs>;

/// Mass, first and second moment about the trunk's origin, and inertial force: of one link or of many.
template <class S>
struct Heap {
  S mass;
  Vec3<S> moment;
  Sym3<S> inertia;
  Vec3<S> force;
  Vec3<S> torque;
};

template <class S>
inline void add(Heap<S>& sum, const Heap<S>& more) noexcept {
  sum.mass = sum.mass + more.mass;
  sum.moment = sum.moment + more.moment;
  sum.inertia = sum.inertia + more.inertia;
  sum.force = sum.force + more.force;
  sum.torque = sum.torque + more.torque;
}

/// The rotation `r` followed by a turn about the joint's axis in its own frame.
template <class S>
inline Rotation<S> turned(const Rotation<S>& r, const JointFigures<Constant<S>>& joint,
                          const SinCos<S>& a) noexcept {
  const S c = a.cos;
  const S s = a.sin * joint.sign;
  switch (joint.kind) {
    case AxisKind::x:
      return {r.x, r.y * c + r.z * s, r.z * c - r.y * s};
    case AxisKind::y:
      return {r.x * c - r.z * s, r.y, r.z * c + r.x * s};
    case AxisKind::z:
      return {r.x * c + r.y * s, r.y * c - r.x * s, r.z};
    case AxisKind::any:
      break;
  }
  // Rodrigues: columns of 1 c + (1 - c) u u' + s [u].
  const auto& u = joint.axis;
  const S k = Constant<S>(1) - c;
  const Vec3<S> x{c + k * (u.x * u.x), k * (u.x * u.y) + a.sin * u.z, k * (u.x * u.z) - a.sin * u.y};
  const Vec3<S> y{k * (u.x * u.y) - a.sin * u.z, c + k * (u.y * u.y), k * (u.y * u.z) + a.sin * u.x};
  const Vec3<S> z{k * (u.x * u.z) + a.sin * u.y, k * (u.y * u.z) - a.sin * u.x, c + k * (u.z * u.z)};
  return {r * x, r * y, r * z};
}

template <class S>
inline Vec3<S> axis_of(const Rotation<S>& r, const JointFigures<Constant<S>>& joint) noexcept {
  switch (joint.kind) {
    case AxisKind::x:
      return r.x * S(joint.sign);
    case AxisKind::y:
      return r.y * S(joint.sign);
    case AxisKind::z:
      return r.z * S(joint.sign);
    case AxisKind::any:
      break;
  }
  return turn(r, joint.axis);
}

/// R I R' for a link: with I = diag, I3 1 + (I1 - I3) ex ex' + (I2 - I3) ey ey'.
template <class S>
inline Sym3<S> turned_inertia(const Rotation<S>& r, const LinkFigures<Constant<S>>& link) noexcept {
  const auto& m = link.inertia;
  const Vec3<S> x = r.x * S(m.xx - m.zz);
  const Vec3<S> y = r.y * S(m.yy - m.zz);
  Sym3<S> sum{m.zz + x.x * r.x.x + y.x * r.y.x, m.zz + x.y * r.x.y + y.y * r.y.y,
              m.zz + x.z * r.x.z + y.z * r.y.z, x.x * r.x.y + y.x * r.y.y,
              x.x * r.x.z + y.x * r.y.z,        x.y * r.x.z + y.y * r.y.z};
  if (link.skewed) {
    const Vec3<S> a = turn(r, Vec3<Constant<S>>{0, m.xy, m.xz});
    const Vec3<S> b = turn(r, Vec3<Constant<S>>{m.xy, 0, m.yz});
    const Vec3<S> c = turn(r, Vec3<Constant<S>>{m.xz, m.yz, 0});
    sum.xx = sum.xx + a.x * r.x.x + b.x * r.y.x + c.x * r.z.x;
    sum.yy = sum.yy + a.y * r.x.y + b.y * r.y.y + c.y * r.z.y;
    sum.zz = sum.zz + a.z * r.x.z + b.z * r.y.z + c.z * r.z.z;
    sum.xy = sum.xy + a.x * r.x.y + b.x * r.y.y + c.x * r.z.y;
    sum.xz = sum.xz + a.x * r.x.z + b.x * r.y.z + c.x * r.z.z;
    sum.yz = sum.yz + a.y * r.x.z + b.y * r.y.z + c.y * r.z.z;
  }
  return sum;
}

/// A link at `centre` with central inertia `inertia`, moving with acceleration `linear` of its centre of
/// mass.
template <class S, class M>
inline Heap<S> heap_of(const M& mass, const Vec3<S>& centre, const Sym3<S>& inertia, const Vec3<S>& rate,
                       const Vec3<S>& angular, const Vec3<S>& linear) noexcept {
  Heap<S> heap{};
  heap.mass = S(mass);
  heap.moment = centre * S(mass);
  const S cc = dot(centre, heap.moment);
  heap.inertia = {inertia.xx + cc - heap.moment.x * centre.x, inertia.yy + cc - heap.moment.y * centre.y,
                  inertia.zz + cc - heap.moment.z * centre.z, inertia.xy - heap.moment.x * centre.y,
                  inertia.xz - heap.moment.x * centre.z,      inertia.yz - heap.moment.y * centre.z};
  heap.force = linear * S(mass);
  heap.torque = inertia * angular + cross(rate, inertia * rate) + cross(centre, heap.force);
  return heap;
}

/// A link `ratio` times as heavy, of the same shape.
template <class S>
inline void weigh(const S& ratio, Heap<S>& heap) noexcept {
  heap.mass = heap.mass * ratio;
  heap.moment = heap.moment * ratio;
  heap.force = heap.force * ratio;
  heap.torque = heap.torque * ratio;
  auto& i = heap.inertia;
  i = {i.xx * ratio, i.yy * ratio, i.zz * ratio, i.xy * ratio, i.xz * ratio, i.yz * ratio};
}

/// Motion of a frame along the chain, with the trunk's acceleration set to minus gravity.
template <class S>
struct Frame {
  Rotation<S> axes;
  Vec3<S> place;
  Vec3<S> rate;
  Vec3<S> angular;
  Vec3<S> linear;
};

template <class S>
inline Vec3<S> accelerated(const Frame<S>& frame, const Vec3<S>& arm) noexcept {
  return frame.linear + cross(frame.angular, arm) + cross(frame.rate, cross(frame.rate, arm));
}

/// From the trunk to the tip: places, axes and each link's heap. K joints.
template <int K, class S>
inline void go_out(const LegFigures<Constant<S>>& leg, const PerChain<S>& angle, const PerChain<S>& speed,
                   Frame<S> frame, LegWork<S>& work, std::array<Heap<S>, K>& heap) noexcept {
  for (int i = 0; i < K; ++i) {
    const auto n = static_cast<std::size_t>(i);
    const auto& joint = leg.joint[n];
    const Vec3<S> step = i == 0 ? spread<S>(joint.origin) : turn(frame.axes, joint.origin);
    frame.linear = accelerated(frame, step);
    frame.place = frame.place + step;
    const Vec3<S> axis = axis_of(frame.axes, joint);
    const Vec3<S> spin = axis * speed[n];
    frame.angular = frame.angular + cross(frame.rate, spin);
    frame.rate = frame.rate + spin;
    frame.axes = turned(frame.axes, joint, sin_cos(angle[n]));
    const Vec3<S> arm = turn(frame.axes, joint.link.centre);
    heap[n] = heap_of(joint.link.mass, frame.place + arm, turned_inertia(frame.axes, joint.link), frame.rate,
                      frame.angular, accelerated(frame, arm));
    work.axis[n] = axis;
    work.place[n] = frame.place;
  }
  work.foot = frame.place + turn(frame.axes, leg.foot);
}

/// From the tip to the trunk: composite bodies, the leg's inertia block, its coupling and its bias.
template <int K, class S>
inline void come_back(LegWork<S>& work, std::array<Heap<S>, K>& heap, Heap<S>& total) noexcept {
  for (int i = K - 1; i >= 0; --i) {
    const auto n = static_cast<std::size_t>(i);
    const Heap<S>& beyond = heap[n];
    const Vec3<S>& axis = work.axis[n];
    const Vec3<S> slide = cross(work.place[n], axis);  // velocity of the trunk's origin as part of the link
    const Vec3<S> moving = slide * beyond.mass + cross(axis, beyond.moment);
    const Vec3<S> turning = beyond.inertia * axis + cross(beyond.moment, slide);
    work.moving[n] = moving;
    work.turning[n] = turning;
    work.force[n] = S(0) - (dot(axis, beyond.torque) + dot(slide, beyond.force));
    for (int j = 0; j <= i; ++j) {
      const auto m = static_cast<std::size_t>(j);
      work.inertia[i][j] = dot(work.axis[m], turning) + dot(cross(work.place[m], work.axis[m]), moving);
    }
    add(i > 0 ? heap[n - (i > 0 ? 1 : 0)] : total, beyond);
  }
}

/// With kWeighed the links are `ratio` times as heavy as in their figures.
template <int K, bool kWeighed = false, class S>
inline void pass_leg(const LegFigures<Constant<S>>& leg, const PerChain<S>& angle, const PerChain<S>& speed,
                     const Frame<S>& trunk, LegWork<S>& work, Heap<S>& total,
                     const PerChain<S>* ratio = nullptr) noexcept {
  std::array<Heap<S>, K> heap{};
  go_out<K>(leg, angle, speed, trunk, work, heap);
  if constexpr (kWeighed) {
    for (std::size_t i = 0; i < K; ++i) weigh((*ratio)[i], heap[i]);
  }
  come_back<K>(work, heap, total);
}

/// A limb of the general kind (limb.h).
template <class S>
inline void pass_limb(const LegFigures<Constant<S>>& limb, const PerChain<S>& angle, const PerChain<S>& speed,
                      const Frame<S>& trunk, LegWork<S>& work, Heap<S>& total,
                      const PerChain<S>* ratio) noexcept;

/// Runs `f.template operator()<K>()` for the number of joints of a leg: loops of known length.
template <class F>
inline void for_chain(int joint_count, F&& f) noexcept {
  switch (joint_count) {
    case 1:
      f.template operator()<1>();
      break;
    case 2:
      f.template operator()<2>();
      break;
    case 3:
      f.template operator()<3>();
      break;
    default:
      f.template operator()<4>();
      break;
  }
}

/// The same with K = 0 for limbs of the general kind.
template <class C, class F>
inline void for_limb(const LegFigures<C>& limb, F&& f) noexcept {
  if (limb.general) {
    f.template operator()<0>();
  } else {
    for_chain(limb.joint_count, f);
  }
}

/// Inertia about the trunk's origin as a 6x6 in [angular; linear], lower triangle, and the bias on the
/// right-hand side.
template <class S>
inline void spread_total(const Heap<S>& total, Work<S>& work) noexcept {
  const auto& j = total.inertia;
  const auto& h = total.moment;
  auto& a = work.inertia;
  a[0][0] = j.xx;
  a[1][0] = j.xy;
  a[1][1] = j.yy;
  a[2][0] = j.xz;
  a[2][1] = j.yz;
  a[2][2] = j.zz;
  const S zero(0);
  // Linear momentum for unit rates: rate x moment.
  a[3][0] = zero;
  a[3][1] = h.z;
  a[3][2] = zero - h.y;
  a[4][0] = zero - h.z;
  a[4][1] = zero;
  a[4][2] = h.x;
  a[5][0] = h.y;
  a[5][1] = zero - h.x;
  a[5][2] = zero;
  for (int i = 3; i < 6; ++i) {
    for (int k = 3; k < i; ++k) a[i][k] = zero;
    a[i][i] = total.mass;
  }
  work.force[0] = zero - total.torque.x;
  work.force[1] = zero - total.torque.y;
  work.force[2] = zero - total.torque.z;
  work.force[3] = zero - total.force.x;
  work.force[4] = zero - total.force.y;
  work.force[5] = zero - total.force.z;
}

/// A trunk whose figures vary with the load it carries, and links that are not as heavy as their figures.
template <class S>
struct TrunkFigures {
  S mass;
  Vec3<S> centre;
  Sym3<S> inertia;                                     ///< about its centre of mass
  bool weighed{false};                                 ///< link_ratio holds
  std::array<PerChain<S>, kMaxTreeLegs> link_ratio{};  ///< times mass and inertia of each limb's links
};

/// Fills `work` for this state: inertia, coupling, bias with gravity. Loads and contacts are added
/// afterwards. With kMade the links are as heavy as their figures.
template <bool kMade = false, class S>
inline void begin_step(const Tree<Constant<S>>& tree, const TrunkFigures<S>& trunk, const BodyState<S>& state,
                       Work<S>& work) noexcept {
  work.body = rotation_of(state.attitude);
  work.velocity = turn_back(work.body, state.velocity);
  const S down = S(0) - S(tree.gravity);
  work.gravity = {work.body.x.z * down, work.body.y.z * down, work.body.z.z * down};
  const S one(1);
  const S zero(0);
  const Frame<S> frame{{{one, zero, zero}, {zero, one, zero}, {zero, zero, one}},
                       zero3<S>(),
                       state.rate,
                       zero3<S>(),
                       zero3<S>() - work.gravity};
  Heap<S> total = heap_of(trunk.mass, trunk.centre, trunk.inertia, frame.rate, frame.angular,
                          accelerated(frame, trunk.centre));
  for (int l = 0; l < tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    for_limb(tree.leg[n], [&]<int K>() {
      const PerChain<S>* ratio = !kMade && trunk.weighed ? &trunk.link_ratio[n] : nullptr;
      if constexpr (K == 0) {
        pass_limb(tree.leg[n], state.angle[n], state.speed[n], frame, work.leg[n], total, ratio);
      } else if (!kMade && ratio != nullptr) {
        pass_leg<K, true>(tree.leg[n], state.angle[n], state.speed[n], frame, work.leg[n], total, ratio);
      } else {
        pass_leg<K>(tree.leg[n], state.angle[n], state.speed[n], frame, work.leg[n], total);
      }
    });
  }
  spread_total(total, work);
}

}  // namespace pastern::stub
