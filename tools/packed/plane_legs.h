// begin_step() of hal_stub/dynamics/motion.h for legs that move in a plane which may be swung sideways: an
// abduction about x (or none), then hip and knee about y, no products of inertia. The same equations written
// out in the axes of that plane, where most terms are constant or zero: about a third of the operations.
// Checked against the general pass in double to 1e-12 (tests/tools/packed).
#pragma once

#include "hal_stub/dynamics/step.h"
#include "hal_stub/robot/robot_state.h"

namespace pastern::packed {

/// Whether all legs are of this kind.
template <class C>
inline bool has_plane_legs(const stub::Tree<C>& tree) noexcept {
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    const auto& leg = tree.leg[l];
    const auto first = static_cast<std::size_t>(leg.joint_count - 2);
    if (leg.general || leg.joint_count < 2 || leg.joint_count > 3) return false;
    for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
      const auto& joint = leg.joint[i];
      if (joint.kind != (i < first ? stub::AxisKind::x : stub::AxisKind::y)) return false;
      if (joint.sign != C(1) || joint.slides || joint.link.skewed) return false;
    }
  }
  return tree.leg_count > 0;
}

/// Mass, first moment, inertia about the plane's origin and inertial force of links, in the plane's axes.
template <class S>
using Links = stub::Heap<S>;

/// A rotation by one angle.
template <class S>
using Turn = stub::SinCos<S>;

/// About y, of a constant vector: its y stays.
template <class S, class C>
inline stub::Vec3<S> about_y(const Turn<S>& t, const stub::Vec3<C>& a) noexcept {
  return {t.cos * a.x + t.sin * a.z, S(a.y), t.cos * a.z - t.sin * a.x};
}
/// About x, there and back.
template <class S>
inline stub::Vec3<S> about_x(const Turn<S>& t, const stub::Vec3<S>& a) noexcept {
  return {a.x, t.cos * a.y - t.sin * a.z, t.sin * a.y + t.cos * a.z};
}
template <class S>
inline stub::Vec3<S> back_about_x(const Turn<S>& t, const stub::Vec3<S>& a) noexcept {
  return {a.x, t.cos * a.y + t.sin * a.z, t.cos * a.z - t.sin * a.y};
}

/// How a body turns, and what takes an arm to the acceleration that it adds: [angular] + [rate][rate].
template <class S>
struct Turning {
  stub::Vec3<S> rate;
  stub::Vec3<S> angular;
  S xx, yy, zz, xy, yx, xz, zx, yz, zy;
};
template <class S>
inline Turning<S> turning_of(const stub::Vec3<S>& rate, const stub::Vec3<S>& angular) noexcept {
  const S x2 = rate.x * rate.x;
  const S y2 = rate.y * rate.y;
  const S z2 = rate.z * rate.z;
  const S xy = rate.x * rate.y;
  const S xz = rate.x * rate.z;
  const S yz = rate.y * rate.z;
  const S zero(0);
  return {rate,           angular,        zero - (y2 + z2), zero - (x2 + z2), zero - (x2 + y2),
          xy - angular.z, xy + angular.z, xz + angular.y,   xz - angular.y,   yz - angular.x,
          yz + angular.x};
}
template <class S, class V>
inline stub::Vec3<S> carried(const Turning<S>& t, const V& arm) noexcept {
  return {t.xx * arm.x + t.xy * arm.y + t.xz * arm.z, t.yx * arm.x + t.yy * arm.y + t.yz * arm.z,
          t.zx * arm.x + t.zy * arm.y + t.zz * arm.z};
}

/// A link turned about y in the plane's axes: no xy, no yz.
template <class S>
struct PlaneInertia {
  S xx, zz, xz;
};
template <class S, class C>
inline PlaneInertia<S> plane_inertia(const Turn<S>& t, const stub::Sym3<C>& own) noexcept {
  const S along = t.sin * (own.zz - own.xx);
  return {own.xx + along * t.sin, own.zz - along * t.sin, along * t.cos};
}

/// A link with its centre of mass at `centre`, whose y is the constant `side`, accelerated by `linear`.
template <class S, class C>
inline Links<S> link_of(const stub::LinkFigures<C>& link, const PlaneInertia<S>& own,
                        const stub::Vec3<S>& centre, C side, const Turning<S>& turn,
                        const stub::Vec3<S>& linear) noexcept {
  const C mass = link.mass;
  Links<S> made;
  made.mass = S(mass);
  made.moment = {centre.x * mass, S(mass * side), centre.z * mass};
  const S x2 = made.moment.x * centre.x;
  const S z2 = made.moment.z * centre.z;
  const C y2 = mass * side * side;
  made.inertia = {own.xx + z2 + y2,        x2 + z2 + link.inertia.yy,         own.zz + x2 + y2,
                  made.moment.x * (-side), own.xz - made.moment.x * centre.z, made.moment.z * (-side)};
  made.force = linear * S(mass);
  const auto& w = turn.rate;
  const auto& a = turn.angular;
  const C yy = link.inertia.yy;
  const stub::Vec3<S> spin{own.xx * w.x + own.xz * w.z, w.y * yy, own.xz * w.x + own.zz * w.z};
  made.torque = {
      own.xx * a.x + own.xz * a.z + (w.y * spin.z - w.z * spin.y) +
          (side * made.force.z - centre.z * made.force.y),
      a.y * yy + (w.z * spin.x - w.x * spin.z) + (centre.z * made.force.x - centre.x * made.force.z),
      own.xz * a.x + own.zz * a.z + (w.x * spin.y - w.y * spin.x) +
          (centre.x * made.force.y - side * made.force.x)};
  return made;
}

/// The links from a joint about y at `place` on: how they move the origin, in the plane's axes.
template <class S>
struct PlaneColumn {
  stub::Vec3<S> turning;
  S moving_x, moving_z;
};
template <class S>
inline PlaneColumn<S> column_of(const Links<S>& links, const stub::Vec3<S>& place) noexcept {
  const auto& h = links.moment;
  const auto& j = links.inertia;
  return {{j.xy + h.y * place.x, j.yy - h.x * place.x - h.z * place.z, j.yz + h.y * place.z},
          h.z - links.mass * place.z,
          links.mass * place.x - h.x};
}

/// Inertia and first moment turned about x, then seen from the trunk's origin.
template <class S>
inline stub::Sym3<S> inertia_about_x(const Turn<S>& t, const stub::Sym3<S>& j) noexcept {
  const S ss = t.sin * t.sin;
  const S sc = t.sin * t.cos;
  const S lean = (j.zz - j.yy) * ss - (sc + sc) * j.yz;
  return {j.xx,
          j.yy + lean,
          j.zz - lean,
          t.cos * j.xy - t.sin * j.xz,
          t.sin * j.xy + t.cos * j.xz,
          sc * (j.yy - j.zz) + j.yz - (ss + ss) * j.yz};
}
template <class S, class C>
inline stub::Sym3<S> moved_inertia(const stub::Sym3<S>& j, const stub::Vec3<S>& h, const S& mass,
                                   const stub::Vec3<C>& o) noexcept {
  const S hx = h.x + mass * (C(0.5) * o.x);
  const S hy = h.y + mass * (C(0.5) * o.y);
  const S hz = h.z + mass * (C(0.5) * o.z);
  const S ox = hx * (C(2) * o.x);
  const S oy = hy * (C(2) * o.y);
  const S oz = hz * (C(2) * o.z);
  return {j.xx + oy + oz,
          j.yy + ox + oz,
          j.zz + ox + oy,
          j.xy - hy * o.x - hx * o.y,
          j.xz - hz * o.x - hx * o.z,
          j.yz - hz * o.y - hy * o.z};
}
template <class S, class C>
inline stub::Vec3<S> crossed(const stub::Vec3<C>& o, const stub::Vec3<S>& a) noexcept {
  return {a.z * o.y - a.y * o.z, a.x * o.z - a.z * o.x, a.y * o.x - a.x * o.y};
}

/// One leg: everything that pass_leg() gives.
template <int K, class S>
inline void pass_plane_leg(const stub::LegFigures<stub::Constant<S>>& leg, const stub::PerChain<S>& angle,
                           const stub::PerChain<S>& speed, const stub::Frame<S>& trunk,
                           stub::LegWork<S>& work, stub::Heap<S>& total) noexcept {
  using stub::sin_cos;
  using C = stub::Constant<S>;
  constexpr bool kSwings = K == 3;
  constexpr std::size_t kHip = K - 2;
  constexpr std::size_t kKnee = K - 1;
  const auto& hip = leg.joint[kHip];
  const auto& knee = leg.joint[kKnee];
  const S zero(C(0));
  Turn<S> swing{zero, S(C(1))};
  if constexpr (kSwings) swing = sin_cos(angle[0]);
  const Turn<S> thigh = sin_cos(angle[kHip]);
  const Turn<S> shank = sin_cos(angle[kHip] + angle[kKnee]);
  const auto out = [&](const stub::Vec3<S>& a) { return kSwings ? about_x(swing, a) : a; };
  const auto in = [&](const stub::Vec3<S>& a) { return kSwings ? back_about_x(swing, a) : a; };

  // Places in the plane's axes, from its origin: the abduction joint, or the hip where there is none.
  const stub::Vec3<C>& origin = leg.joint[0].origin;
  const stub::Vec3<C> at_hip = kSwings ? hip.origin : stub::Vec3<C>{0, 0, 0};
  const stub::Vec3<S> hip_at = stub::spread<S>(at_hip);
  const stub::Vec3<S> to_knee = about_y(thigh, knee.origin);
  const stub::Vec3<S> to_thigh = about_y(thigh, hip.link.centre);
  const stub::Vec3<S> to_shank = about_y(shank, knee.link.centre);
  const stub::Vec3<S> knee_at = hip_at + to_knee;
  const stub::Vec3<S> foot_at = knee_at + about_y(shank, leg.foot);

  // Motion.
  const stub::Vec3<S> at_origin = trunk.linear - stub::cross(trunk.rate, crossed(origin, trunk.rate));
  const stub::Vec3<S> linear = in(at_origin);
  stub::Vec3<S> rate = in(trunk.rate);
  stub::Vec3<S> angular{zero, zero, zero};
  if constexpr (kSwings) {
    angular = {zero, rate.z * speed[0], zero - rate.y * speed[0]};
    rate.x = rate.x + speed[0];
  }
  const Turning<S> first = turning_of(rate, angular);
  const S down = speed[kHip] + speed[kKnee];
  const Turning<S> second = turning_of(
      stub::Vec3<S>{rate.x, rate.y + speed[kHip], rate.z},
      stub::Vec3<S>{angular.x - speed[kHip] * rate.z, angular.y, angular.z + speed[kHip] * rate.x});
  const Turning<S> third =
      turning_of(stub::Vec3<S>{rate.x, rate.y + down, rate.z},
                 stub::Vec3<S>{angular.x - down * rate.z, angular.y, angular.z + down * rate.x});
  const stub::Vec3<S> hip_linear = kSwings ? linear + carried(first, at_hip) : linear;
  const stub::Vec3<S> knee_linear = hip_linear + carried(second, to_knee);

  // Links, from the tip on.
  const C knee_side = at_hip.y + knee.origin.y;
  const Links<S> tip = link_of(knee.link, plane_inertia(shank, knee.link.inertia), knee_at + to_shank,
                               knee_side + knee.link.centre.y, third, knee_linear + carried(third, to_shank));
  Links<S> both = link_of(hip.link, plane_inertia(thigh, hip.link.inertia), hip_at + to_thigh,
                          at_hip.y + hip.link.centre.y, second, hip_linear + carried(second, to_thigh));
  stub::add(both, tip);
  both.mass = S(hip.link.mass + knee.link.mass);
  const PlaneColumn<S> of_knee = column_of(tip, knee_at);
  const PlaneColumn<S> of_hip = column_of(both, hip_at);
  const auto bias = [&](const Links<S>& links, const stub::Vec3<S>& place) {
    return zero - (links.torque.y + (place.x * links.force.z - place.z * links.force.x));
  };
  work.force[kKnee] = bias(tip, knee_at);
  work.force[kHip] = bias(both, hip_at);
  const auto against_hip = [&](const PlaneColumn<S>& column) {
    return column.turning.y + (at_hip.x * column.moving_z - at_hip.z * column.moving_x);
  };
  work.inertia[kKnee][kKnee] =
      of_knee.turning.y + (knee_at.x * of_knee.moving_z - knee_at.z * of_knee.moving_x);
  work.inertia[kKnee][kHip] = against_hip(of_knee);
  work.inertia[kHip][kHip] = against_hip(of_hip);
  Links<S>& all = both;
  if constexpr (kSwings) {
    work.inertia[kKnee][0] = of_knee.turning.x;
    work.inertia[kHip][0] = of_hip.turning.x;
    const auto& own = leg.joint[0].link;
    const PlaneInertia<S> inertia{S(own.inertia.xx), S(own.inertia.zz), zero};
    stub::add(all, link_of(own, inertia, stub::spread<S>(own.centre), own.centre.y, first,
                           linear + carried(first, own.centre)));
    all.mass = S(own.mass + (hip.link.mass + knee.link.mass));
    work.inertia[0][0] = all.inertia.xx;
    work.force[0] = zero - all.torque.x;
    const stub::Vec3<S> moving = out({zero, zero - all.moment.z, all.moment.y});
    work.moving[0] = moving;
    work.turning[0] = out({all.inertia.xx, all.inertia.xy, all.inertia.xz}) + crossed(origin, moving);
    work.axis[0] = {S(C(1)), zero, zero};
    work.place[0] = stub::spread<S>(origin);
  }
  const auto put_column = [&](std::size_t n, const PlaneColumn<S>& column, const stub::Vec3<S>& place) {
    const stub::Vec3<S> moving = out({column.moving_x, zero, column.moving_z});
    work.moving[n] = moving;
    work.turning[n] = out(column.turning) + crossed(origin, moving);
    work.axis[n] = {zero, swing.cos, swing.sin};
    work.place[n] = out(place) + stub::spread<S>(origin);
  };
  put_column(kHip, of_hip, hip_at);
  put_column(kKnee, of_knee, knee_at);
  work.foot = out(foot_at) + stub::spread<S>(origin);

  // The whole leg, seen from the trunk.
  const stub::Vec3<S> moment = out(all.moment);
  const stub::Vec3<S> force = out(all.force);
  const stub::Sym3<S> inertia = kSwings ? inertia_about_x(swing, all.inertia) : all.inertia;
  stub::add(total,
            {all.mass,
             {moment.x + all.mass * origin.x, moment.y + all.mass * origin.y, moment.z + all.mass * origin.z},
             moved_inertia(inertia, moment, all.mass, origin),
             force,
             out(all.torque) + crossed(origin, force)});
}

/// begin_step() for such legs.
template <class S>
inline void begin_plane_step(const stub::Tree<stub::Constant<S>>& tree, const stub::TrunkFigures<S>& trunk,
                             const stub::BodyState<S>& state, stub::Work<S>& work) noexcept {
  work.body = stub::rotation_of(state.attitude);
  work.velocity = stub::turn_back(work.body, state.velocity);
  const S down = S(0) - S(tree.gravity);
  work.gravity = {work.body.x.z * down, work.body.y.z * down, work.body.z.z * down};
  const stub::Vec3<S> zero = stub::zero3<S>();
  const stub::Frame<S> frame{{zero, zero, zero}, zero, state.rate, zero, zero - work.gravity};
  stub::Heap<S> total = stub::heap_of(trunk.mass, trunk.centre, trunk.inertia, frame.rate, frame.angular,
                                      stub::accelerated(frame, trunk.centre));
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    if (tree.leg[l].joint_count == 3) {
      pass_plane_leg<3>(tree.leg[l], state.angle[l], state.speed[l], frame, work.leg[l], total);
    } else {
      pass_plane_leg<2>(tree.leg[l], state.angle[l], state.speed[l], frame, work.leg[l], total);
    }
  }
  stub::spread_total(total, work);
}

/// step_robot() of hal_stub/robot/robot_state.h for such legs, at a site where robots are as made.
template <class S>
inline void step_plane_robot(const stub::Figures<stub::Constant<S>>& figures,
                             const stub::SiteFigures<S>& site, const stub::Told<S>& told,
                             stub::Constant<S> dt, stub::RobotState<S>& state,
                             stub::RobotWork<S>& work) noexcept {
  stub::drive_joints<true>(figures, site, told, dt, state, work);
  const auto speed_before = state.body.speed;
  const auto& around = site.around;
  stub::Work<S>& body = work.body;
  begin_plane_step(figures.tree, around.trunk, state.body, body);
  stub::add_loads(figures.tree, state.body, work.loads, dt, body);
  stub::add_push(around, body);
  const stub::Below<S> below = stub::below_of(around.ground, body.body, state.body.position);
  stub::touch_ground<true>(figures.tree, around.ground, below, dt, state.body, body);
  stub::solve(figures.tree, body);
  stub::touch_ground<false>(figures.tree, around.ground, below, dt, state.body, body);
  stub::integrate(figures.tree, dt, body, state.body);
  stub::move_rotors<true>(figures, site, dt, speed_before, state, work);
  stub::draw(figures.pack, site.pack, work.power, dt, state.pack);
}

}  // namespace pastern::packed
