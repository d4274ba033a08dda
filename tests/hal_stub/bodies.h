// Small bodies for the tests, and what is conserved, written independently of the product's recursion: link
// by link in world axes.
#pragma once

#include <array>
#include <cmath>

#include "hal_stub/dynamics/step.h"

namespace pastern::stub {

using TreeD = Tree<double>;
using StateD = BodyState<double>;
using V3 = Vec3<double>;

inline JointFigures<double> hinge(AxisKind kind, V3 origin, double mass, V3 centre, V3 inertia) {
  JointFigures<double> j;
  j.kind = kind;
  j.axis = kind == AxisKind::x ? V3{1, 0, 0} : kind == AxisKind::y ? V3{0, 1, 0} : V3{0, 0, 1};
  j.origin = origin;
  j.angle_min = -1e9;
  j.angle_max = 1e9;
  j.link.mass = mass;
  j.link.centre = centre;
  j.link.inertia = {inertia.x, inertia.y, inertia.z, 0, 0, 0};
  return j;
}

/// Base and four legs of the reference vector (tests/hal_stub/floating_vector.h).
inline TreeD reference_tree() {
  TreeD tree;
  tree.joint_count = 12;
  tree.leg_count = 4;
  tree.gravity = 9.81;
  tree.trunk.mass = 12;
  tree.trunk.centre = {0.01, 0, 0.02};
  tree.trunk.inertia = {0.08, 0.25, 0.28, 0, 0, 0};
  int order = 0;
  for (std::size_t l = 0; l < 4; ++l) {
    const double sx = l < 2 ? 1 : -1;
    const double sy = l % 2 == 0 ? 1 : -1;
    auto& leg = tree.leg[l];
    leg.joint_count = 3;
    leg.joint[0] =
        hinge(AxisKind::x, {0.2 * sx, 0.1 * sy, 0}, 0.6, {0, 0.03 * sy, 0}, {0.0005, 0.0006, 0.0007});
    leg.joint[1] = hinge(AxisKind::y, {0, 0.08 * sy, 0}, 1, {0, 0, -0.1}, {0.004, 0.004, 0.0006});
    leg.joint[2] = hinge(AxisKind::y, {0, 0, -0.22}, 0.3, {0, 0, -0.1}, {0.0015, 0.0015, 0.0001});
    for (auto& joint : leg.joint) joint.order = order++;
    --order;
    leg.foot = {0, 0, -0.22};
  }
  return tree;
}

inline TrunkFigures<double> trunk_of(const TreeD& tree) {
  return {tree.trunk.mass, tree.trunk.centre, tree.trunk.inertia};
}

struct Totals {
  double mass{0};
  double kinetic{0};
  double potential{0};
  V3 centre{0, 0, 0};
  V3 momentum{0, 0, 0};
  V3 spin{0, 0, 0};  ///< angular momentum about the centre of mass
};

namespace detail {
inline Rotation<double> times(const Rotation<double>& a, const Rotation<double>& b) {
  return {a * b.x, a * b.y, a * b.z};
}
inline Rotation<double> about(const V3& u, double angle) {
  const double c = std::cos(angle);
  const double s = std::sin(angle);
  const double k = 1 - c;
  return {{c + k * u.x * u.x, k * u.x * u.y + s * u.z, k * u.x * u.z - s * u.y},
          {k * u.x * u.y - s * u.z, c + k * u.y * u.y, k * u.y * u.z + s * u.x},
          {k * u.x * u.z + s * u.y, k * u.y * u.z - s * u.x, c + k * u.z * u.z}};
}
struct Moving {
  double mass;
  V3 at;
  V3 velocity;
  V3 rate;
  V3 spin;
};
struct Carried {
  Rotation<double> axes;
  V3 place;
  V3 velocity;
  V3 rate;
};
inline Moving moving(const LinkFigures<double>& link, const Rotation<double>& axes, const V3& place,
                     const V3& velocity, const V3& rate) {
  const V3 arm = axes * link.centre;
  return {link.mass, place + arm, velocity + cross(rate, arm), rate,
          axes * (link.inertia * turn_back(axes, rate))};
}
}  // namespace detail

/// Sums over all links in world axes.
inline Totals totals(const TreeD& tree, const StateD& state) {
  std::array<detail::Moving, 80> link{};
  std::size_t count = 0;
  const Rotation<double> body = rotation_of(state.attitude);
  const V3 base_rate = body * state.rate;
  link[count++] = detail::moving(tree.trunk, body, state.position, state.velocity, base_rate);
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    std::array<detail::Carried, kMaxLimb> link_at{};
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      const auto& joint = tree.leg[l].joint[i];
      // A chain's joints say nothing of their parents: the one before.
      const int parent = tree.leg[l].general ? joint.parent : static_cast<int>(i) - 1;
      const detail::Carried at = parent < 0 ? detail::Carried{body, state.position, state.velocity, base_rate}
                                            : link_at[static_cast<std::size_t>(parent)];
      detail::Carried to = at;
      V3 step = at.axes * joint.origin;
      const V3 axis = at.axes * joint.axis;
      if (joint.slides) step = step + axis * state.angle[l][i];
      to.velocity = at.velocity + cross(at.rate, step);
      to.place = at.place + step;
      if (joint.slides) {
        to.velocity = to.velocity + axis * state.speed[l][i];
      } else {
        to.rate = at.rate + axis * state.speed[l][i];
        to.axes = detail::times(at.axes, detail::about(joint.axis, state.angle[l][i]));
      }
      link_at[i] = to;
      link[count++] = detail::moving(joint.link, to.axes, to.place, to.velocity, to.rate);
    }
  }
  Totals t;
  for (std::size_t i = 0; i < count; ++i) {
    t.mass += link[i].mass;
    t.centre = t.centre + link[i].at * link[i].mass;
    t.momentum = t.momentum + link[i].velocity * link[i].mass;
    t.kinetic +=
        0.5 * link[i].mass * dot(link[i].velocity, link[i].velocity) + 0.5 * dot(link[i].rate, link[i].spin);
    t.potential += link[i].mass * tree.gravity * link[i].at.z;
  }
  t.centre = t.centre * (1 / t.mass);
  for (std::size_t i = 0; i < count; ++i) {
    t.spin = t.spin + link[i].spin + cross(link[i].at - t.centre, link[i].velocity * link[i].mass);
  }
  return t;
}

/// Ground far below everything.
inline Surroundings<double> in_the_air(const TreeD& tree) {
  Surroundings<double> around;
  around.trunk = trunk_of(tree);
  around.ground.stiffness = 0;
  around.ground.damping = 0;
  around.ground.friction = 0;
  return around;
}

}  // namespace pastern::stub
