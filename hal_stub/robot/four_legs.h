// The step of a robot with four legs of one kind (same joints about the same axes, any sizes): the legs go
// through the same templates as everywhere, four at once; the trunk's share is summed and solved in double.
// Private to advance.cpp.
#pragma once

#include "hal_stub/robot/quad.h"
#include "hal_stub/robot/robot_state.h"

namespace pastern::stub {

inline constexpr std::size_t kFour = 4;

/// Figures and site with the four legs side by side; entry i of a leg's chain is joint i of each leg.
struct FourLegs {
  Figures<Quad> figures;  ///< one leg, drives in the chain's order
  SiteFigures<Quad> site;
  std::array<std::array<std::size_t, kFour>, kMaxChain> order{};  ///< joint order of (i, leg)
};

/// What is the same for all legs, spread, and the legs' own.
struct FourWork {
  RobotState<Quad> state;
  RobotWork<Quad> work;
  Told<Quad> told;
};

inline bool is_four_alike(const Tree<double>& tree) noexcept {
  if (tree.leg_count != 4) return false;
  const auto& first = tree.leg[0];
  for (const auto& leg : {tree.leg[0], tree.leg[1], tree.leg[2], tree.leg[3]}) {
    if (leg.general || leg.joint_count != first.joint_count || leg.knee != first.knee) return false;
    for (std::size_t i = 0; i < static_cast<std::size_t>(first.joint_count); ++i) {
      if (leg.joint[i].kind != first.joint[i].kind) return false;
      if (leg.joint[i].link.skewed != first.joint[i].link.skewed) return false;
    }
  }
  return true;
}

/// f(leg) for each leg, side by side.
template <class F>
inline Quad quad_of(F&& f) noexcept {
  return {f(std::size_t{0}), f(std::size_t{1}), f(std::size_t{2}), f(std::size_t{3})};
}
template <class F>
inline Vec3<Quad> quads_of(F&& f) noexcept {
  return {quad_of([&](std::size_t l) { return f(l).x; }), quad_of([&](std::size_t l) { return f(l).y; }),
          quad_of([&](std::size_t l) { return f(l).z; })};
}
template <class F>
inline Sym3<Quad> sym_of(F&& f) noexcept {
  return {quad_of([&](std::size_t l) { return f(l).xx; }), quad_of([&](std::size_t l) { return f(l).yy; }),
          quad_of([&](std::size_t l) { return f(l).zz; }), quad_of([&](std::size_t l) { return f(l).xy; }),
          quad_of([&](std::size_t l) { return f(l).xz; }), quad_of([&](std::size_t l) { return f(l).yz; })};
}
inline void spread_to(const Quad& from, const std::array<std::size_t, kFour>& order,
                      PerDrive<double>& to) noexcept {
  for (std::size_t l = 0; l < kFour; ++l) to[order[l]] = from.v[l];
}
inline Quad gathered(const PerDrive<double>& from, const std::array<std::size_t, kFour>& order) noexcept {
  return {from[order[0]], from[order[1]], from[order[2]], from[order[3]]};
}

/// The constant part, once.
inline void pack_figures(const Figures<double>& from, FourLegs& to) noexcept {
  auto& leg = to.figures.tree.leg[0];
  const auto& legs = from.tree.leg;
  to.figures.tree.leg_count = 1;
  to.figures.tree.gravity = from.tree.gravity;
  to.figures.tree.stop_stiffness = from.tree.stop_stiffness;
  to.figures.tree.stop_damping = from.tree.stop_damping;
  to.figures.teeth[0] = {from.teeth[0].stiffness, from.teeth[0].damping};
  to.figures.pack.nominal = from.pack.nominal;
  leg.joint_count = legs[0].joint_count;
  leg.knee = legs[0].knee;
  leg.foot = quads_of([&](std::size_t l) { return legs[l].foot; });
  leg.foot_radius = quad_of([&](std::size_t l) { return legs[l].foot_radius; });
  leg.knee_radius = quad_of([&](std::size_t l) { return legs[l].knee_radius; });
  for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
    auto& joint = leg.joint[i];
    const auto at = [&](std::size_t l) -> const JointFigures<double>& { return legs[l].joint[i]; };
    joint.kind = at(0).kind;
    joint.order = static_cast<int>(i);
    joint.sign = quad_of([&](std::size_t l) { return at(l).sign; });
    joint.axis = quads_of([&](std::size_t l) { return at(l).axis; });
    joint.origin = quads_of([&](std::size_t l) { return at(l).origin; });
    joint.angle_min = quad_of([&](std::size_t l) { return at(l).angle_min; });
    joint.angle_max = quad_of([&](std::size_t l) { return at(l).angle_max; });
    joint.link.mass = quad_of([&](std::size_t l) { return at(l).link.mass; });
    joint.link.centre = quads_of([&](std::size_t l) { return at(l).link.centre; });
    joint.link.inertia = sym_of([&](std::size_t l) { return at(l).link.inertia; });
    joint.link.skewed = at(0).link.skewed;
    for (std::size_t l = 0; l < kFour; ++l) to.order[i][l] = static_cast<std::size_t>(at(l).order);
    const auto drive = [&](std::size_t l) -> const DriveFigures<double>& {
      return from.drive[to.order[i][l]];
    };
    auto& d = to.figures.drive[i];
    d.peak_torque = quad_of([&](std::size_t l) { return drive(l).peak_torque; });
    d.no_load_speed = quad_of([&](std::size_t l) { return drive(l).no_load_speed; });
    d.rotor_inertia = quad_of([&](std::size_t l) { return drive(l).rotor_inertia; });
    d.per_amp = quad_of([&](std::size_t l) { return drive(l).per_amp; });
    d.resistance = quad_of([&](std::size_t l) { return drive(l).resistance; });
    d.winding_per_j = quad_of([&](std::size_t l) { return drive(l).winding_per_j; });
    d.housing_per_j = quad_of([&](std::size_t l) { return drive(l).housing_per_j; });
    d.to_housing = quad_of([&](std::size_t l) { return drive(l).to_housing; });
    d.to_air = quad_of([&](std::size_t l) { return drive(l).to_air; });
    d.timeout_damping = quad_of([&](std::size_t l) { return drive(l).timeout_damping; });
    d.most_torque = quad_of([&](std::size_t l) { return drive(l).most_torque; });
    d.hot = quad_of([&](std::size_t l) { return drive(l).hot; });
    d.per_derating = quad_of([&](std::size_t l) { return drive(l).per_derating; });
  }
}

/// What a site makes of it, once a site.
inline void pack_site(const SiteFigures<double>& from, FourLegs& to) noexcept {
  to.site.around.ground = spread_ground<Quad>(from.around.ground);
  to.site.drives.ambient = from.drives.ambient;
  to.site.drives.plain = from.drives.plain;
  to.site.around.trunk.weighed = from.around.trunk.weighed;
  for (std::size_t i = 0; i < static_cast<std::size_t>(to.figures.tree.leg[0].joint_count); ++i) {
    to.site.drives.strength[i] = gathered(from.drives.strength, to.order[i]);
    to.site.drives.damping[i] = gathered(from.drives.damping, to.order[i]);
    to.site.drives.coulomb[i] = gathered(from.drives.coulomb, to.order[i]);
    to.site.drives.half_gap[i] = gathered(from.drives.half_gap, to.order[i]);
    to.site.drives.loss[i] = gathered(from.drives.loss, to.order[i]);
    to.site.drives.stick[i] = gathered(from.drives.stick, to.order[i]);
    to.site.around.trunk.link_ratio[0][i] =
        quad_of([&](std::size_t l) { return from.around.trunk.link_ratio[l][i]; });
  }
}

template <bool kPlain>
inline void take_in(const FourLegs& four, const Told<double>& told, const RobotState<double>& state,
                    FourWork& side) noexcept {
  auto& body = side.state.body;
  body.rate = spread<Quad>(state.body.rate);
  side.state.pack.voltage = state.pack.voltage;
  if constexpr (!kPlain) side.state.pack.share = state.pack.share;
  side.told.on = told.on;
  side.told.damping = told.damping;
  for (std::size_t i = 0; i < static_cast<std::size_t>(four.figures.tree.leg[0].joint_count); ++i) {
    const auto& order = four.order[i];
    body.angle[0][i] = quad_of([&](std::size_t l) { return state.body.angle[l][i]; });
    body.speed[0][i] = quad_of([&](std::size_t l) { return state.body.speed[l][i]; });
    auto& d = side.state.drives;
    d.rotor_angle[i] = gathered(state.drives.rotor_angle, order);
    d.rotor_speed[i] = gathered(state.drives.rotor_speed, order);
    d.winding[i] = gathered(state.drives.winding, order);
    d.housing[i] = gathered(state.drives.housing, order);
    if constexpr (!kPlain) d.wound[i] = gathered(state.drives.wound, order);
    side.told.wanted[i] = gathered(told.wanted, order);
    side.told.forced[i] = gathered(told.forced, order);
  }
  for (std::size_t p = 0; p < kPointsPerLeg; ++p) {
    body.grip.leg[0][p] = quad_of([&](std::size_t l) { return state.body.grip.leg[l][p]; });
  }
}

template <bool kPlain>
inline void give_back(const FourLegs& four, const FourWork& side, RobotState<double>& state) noexcept {
  const auto& body = side.state.body;
  for (std::size_t i = 0; i < static_cast<std::size_t>(four.figures.tree.leg[0].joint_count); ++i) {
    const auto& order = four.order[i];
    for (std::size_t l = 0; l < kFour; ++l) {
      state.body.angle[l][i] = body.angle[0][i].v[l];
      state.body.speed[l][i] = body.speed[0][i].v[l];
    }
    const auto& d = side.state.drives;
    spread_to(d.torque[i], order, state.drives.torque);
    spread_to(d.rotor_angle[i], order, state.drives.rotor_angle);
    spread_to(d.rotor_speed[i], order, state.drives.rotor_speed);
    spread_to(d.winding[i], order, state.drives.winding);
    spread_to(d.housing[i], order, state.drives.housing);
    if constexpr (!kPlain) spread_to(d.wound[i], order, state.drives.wound);
  }
  for (std::size_t p = 0; p < kPointsPerLeg; ++p) {
    for (std::size_t l = 0; l < kFour; ++l) state.body.grip.leg[l][p] = body.grip.leg[0][p].v[l];
  }
}

inline Heap<double> summed(const Heap<Quad>& heap) noexcept {
  const auto vec = [](const Vec3<Quad>& a) { return Vec3<double>{sum(a.x), sum(a.y), sum(a.z)}; };
  const auto& i = heap.inertia;
  return {sum(heap.mass),
          vec(heap.moment),
          {sum(i.xx), sum(i.yy), sum(i.zz), sum(i.xy), sum(i.xz), sum(i.yz)},
          vec(heap.force),
          vec(heap.torque)};
}

/// A robot of that kind: figures as they are and packed, and scratch.
struct FourLegged {
  explicit FourLegged(const Figures<double>& of) : figures(of) {}
  const Figures<double>& figures;
  FourLegs four{};
  FourWork side{};
};

/// Begins the step: the legs' blocks side by side, the trunk's in double.
template <int K, bool kPlain>
inline void begin_four(FourLegged& robot, const SiteFigures<double>& site, const RobotState<double>& state,
                       Work<double>& work) noexcept {
  FourWork& side = robot.side;
  work.body = rotation_of(state.body.attitude);
  work.velocity = turn_back(work.body, state.body.velocity);
  const double down = -robot.figures.tree.gravity;
  work.gravity = {work.body.x.z * down, work.body.y.z * down, work.body.z.z * down};
  const Vec3<double> rate = state.body.rate;
  const Vec3<double> lift = zero3<double>() - work.gravity;
  const auto& trunk = site.around.trunk;
  Heap<double> total = heap_of(trunk.mass, trunk.centre, trunk.inertia, rate, zero3<double>(),
                               lift + cross(rate, cross(rate, trunk.centre)));
  const Frame<Quad> frame{{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
                          zero3<Quad>(),
                          spread<Quad>(rate),
                          zero3<Quad>(),
                          spread<Quad>(lift)};
  auto& legs = side.work.body;
  legs.velocity = spread<Quad>(work.velocity);
  Heap<Quad> beyond{};
  const auto& tree = robot.four.figures.tree;
  const auto& ratio = robot.four.site.around.trunk;
  if (!kPlain && ratio.weighed) {
    pass_leg<K, true>(tree.leg[0], side.state.body.angle[0], side.state.body.speed[0], frame, legs.leg[0],
                      beyond, &ratio.link_ratio[0]);
  } else {
    pass_leg<K>(tree.leg[0], side.state.body.angle[0], side.state.body.speed[0], frame, legs.leg[0], beyond);
  }
  add(total, summed(beyond));
  spread_total(total, work);
  for (int r = 0; r < 6; ++r) {
    legs.force[r] = 0;
    for (int c = 0; c <= r; ++c) legs.inertia[r][c] = 0;
  }
}

/// What legs and their contacts add to the trunk's equations.
inline void sum_up(const Work<Quad>& legs, Work<double>& work) noexcept {
  for (int r = 0; r < 6; ++r) {
    work.force[r] += sum(legs.force[r]);
    for (int c = 0; c <= r; ++c) work.inertia[r][c] += sum(legs.inertia[r][c]);
  }
}

template <int K>
inline void integrate_four(double dt, FourWork& side) noexcept {
  auto& body = side.state.body;
  for (std::size_t i = 0; i < K; ++i) {
    body.speed[0][i] = body.speed[0][i] + side.work.body.leg[0].acceleration[i] * Quad(dt);
    body.angle[0][i] = body.angle[0][i] + body.speed[0][i] * Quad(dt);
  }
}

/// Contacts of legs and trunk: press (before solving) or grip (after).
template <bool kPress, int K>
inline void touch_four(FourLegged& robot, const PlainFooting<double>& on, RobotState<double>& state,
                       Work<double>& work) noexcept {
  const Below<Quad> below{spread<Quad>(on.below.normal), on.below.height};
  const PlainFooting<Quad> legs_on{robot.four.site.around.ground, below, on.dt};
  touch_leg<kPress, K>(robot.four.figures.tree.leg[0], 0, legs_on, robot.side.state.body,
                       robot.side.work.body);
  touch_trunk<kPress>(robot.figures.tree, on, state.body, work);
}
template <bool kPress, int K>
inline void touch_four(FourLegged& robot, const ShapedFooting<double>& on, RobotState<double>& state,
                       Work<double>& work) noexcept {
  const Below<Quad> below{spread<Quad>(on.below.normal), on.below.height};
  const auto& at = on.stand;
  const Stand<Quad> stand{spread<Quad>(at.along), spread<Quad>(at.left), at.way, at.side};
  const ShapedFooting<Quad> legs_on{robot.four.site.around.ground, below, stand, on.dt};
  touch_leg<kPress, K>(robot.four.figures.tree.leg[0], 0, legs_on, robot.side.state.body,
                       robot.side.work.body);
  touch_trunk<kPress>(robot.figures.tree, on, state.body, work);
}

/// Whether the short form will do: plain ground and drives, links as they are made, nothing that hangs.
inline bool is_plain(const SiteFigures<double>& site) noexcept {
  return site.around.ground.plain && as_made(site);
}

/// step_robot for four legs of K joints, at a site that is plain or any.
template <int K, bool kPlain>
inline void step_four(FourLegged& robot, const SiteFigures<double>& site, const Told<double>& told, double dt,
                      RobotState<double>& state, RobotWork<double>& work) noexcept {
  const FourLegs& four = robot.four;
  FourWork& side = robot.side;
  Work<Quad>& legs = side.work.body;
  take_in<kPlain>(four, told, state, side);
  drive_joints<kPlain>(four.figures, four.site, side.told, Quad(dt), side.state, side.work);
  const auto speed_before = side.state.body.speed;
  begin_four<K, kPlain>(robot, site, state, work.body);
  load_leg(four.figures.tree, 0, side.state.body, side.work.loads, Quad(dt), legs.leg[0]);
  add_push(site.around, work.body);
  if (!kPlain && site.around.hangs) hang(site.around.hanging, dt, state.body, work.body);
  const auto& ground = site.around.ground;
  const Below<double> below = below_of(ground, work.body.body, state.body.position);
  const auto on = [&] {
    if constexpr (kPlain) {
      return PlainFooting<double>{ground, below, dt};
    } else {
      return ShapedFooting<double>{ground, below, stand_of(ground, work.body.body, state.body.position), dt};
    }
  }();
  touch_four<true, K>(robot, on, state, work.body);
  eliminate_leg<K>(legs.leg[0], legs);
  sum_up(legs, work.body);
  solve_trunk(work.body);
  for (int i = 0; i < 6; ++i) legs.acceleration[i] = work.body.acceleration[i];
  follow_leg<K>(legs.leg[0], legs.acceleration);
  touch_four<false, K>(robot, on, state, work.body);
  if (!kPlain && site.around.hangs) swing(site.around.hanging, dt, work.body, state.body);
  integrate_four<K>(dt, side);
  integrate_trunk(dt, work.body, state.body);
  move_rotors<kPlain>(four.figures, four.site, Quad(dt), speed_before, side.state, side.work);
  give_back<kPlain>(four, side, state);
  work.power = sum(side.work.power) + robot.figures.pack.idle;
  work.mechanical = sum(side.work.mechanical);
  draw(robot.figures.pack, site.pack, work.power, dt, state.pack);
  if constexpr (!kPlain) hold_back(robot.figures.pack, dt, state.pack);
}

}  // namespace pastern::stub
