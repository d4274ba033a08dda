// A load that hangs and swings against the closed forms of pendulums.
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "tests/hal_stub/bodies.h"

namespace pastern::stub {
namespace {

constexpr double kGravity = 9.80665;
constexpr double kStretch = 0.001;  // m, at rest

struct Hung {
  TreeD tree;
  Surroundings<double> around;
  StateD state;
  Work<double> work{};
  Loads<double> loads{};

  Hung(double trunk_mass, double load, double length) {
    tree.gravity = kGravity;
    tree.trunk.mass = trunk_mass;
    tree.trunk.inertia = {0.01 * trunk_mass, 0.02 * trunk_mass, 0.025 * trunk_mass, 0, 0, 0};
    around = in_the_air(tree);
    const double stiffness = load * kGravity / kStretch;
    around.hangs = true;
    around.hanging = {{0, 0, 0}, length - kStretch, stiffness, std::sqrt(stiffness * load), 0, 1 / load};
    state.swing.place = {0, 0, -length};
  }
  /// A trunk that nothing moves.
  static Hung held(double load, double length) {
    Hung made(1e12, load, length);
    made.around.push = {0, 0, 1e12 * kGravity};
    return made;
  }
  void step(double dt) { step_body(tree, around, loads, dt, state, work); }
  [[nodiscard]] double energy() const {
    const auto& s = state;
    const V3 arm = s.swing.place - rotation_of(s.attitude) * around.hanging.at;
    const double stretch = std::max(std::sqrt(dot(arm, arm)) - around.hanging.length, 0.0);
    const double load = 1 / around.hanging.inverse_mass;
    return tree.trunk.mass * (dot(s.velocity, s.velocity) / 2 + kGravity * s.position.z) +
           dot(s.rate, tree.trunk.inertia * s.rate) / 2 +
           load *
               (dot(s.swing.velocity, s.swing.velocity) / 2 + kGravity * (s.position.z + s.swing.place.z)) +
           around.hanging.stiffness * stretch * stretch / 2;
  }
};

// Source: mathematical pendulum: T = 2 pi sqrt(l / g) (1 + a^2 / 16).
TEST(Hanging, SwingsWithThePeriodOfThePendulum) {
  for (const double length : {0.1, 0.25}) {
    Hung h = Hung::held(3, length);
    const double a = 0.05;
    h.state.swing.place = {length * std::sin(a), 0, -length * std::cos(a)};
    const double dt = 1e-3;
    double first = 0;
    double last = 0;
    int turns = 0;
    for (long k = 1; turns < 21; ++k) {
      const double before = h.state.swing.place.x;
      h.step(dt);
      const double now = h.state.swing.place.x;
      if (!(before < 0 && now >= 0)) continue;
      last = (static_cast<double>(k) - now / (now - before)) * dt;
      if (turns++ == 0) first = last;
    }
    const double period = 2 * std::numbers::pi * std::sqrt(length / kGravity) * (1 + a * a / 16);
    EXPECT_NEAR((last - first) / 20, period, 1e-3 * period) << length;
  }
}

// Source: conical pendulum: angular speed sqrt(g / (l cos a)).
TEST(Hanging, CirclesAsAConicalPendulum) {
  const double length = 0.25;
  const double a = 0.3;
  const double taut = length - kStretch + kStretch / std::cos(a);  // the strap carries m g / cos a
  const double turning = std::sqrt(kGravity / (taut * std::cos(a)));
  Hung h = Hung::held(2, length);
  h.state.swing.place = {taut * std::sin(a), 0, -taut * std::cos(a)};
  h.state.swing.velocity = {0, turning * taut * std::sin(a), 0};
  const double dt = 1e-4;
  const auto steps = std::lround(2 * std::numbers::pi / turning / dt);
  for (long k = 0; k < steps; ++k) {
    h.step(dt);
    EXPECT_NEAR(h.state.swing.place.z, -taut * std::cos(a), 2e-4);
  }
  EXPECT_NEAR(h.state.swing.place.x, taut * std::sin(a), 1e-3);
  EXPECT_NEAR(h.state.swing.place.y, 0, 1e-3);
}

// 2 zeta m sqrt(g / l) across the strap: the swing shrinks by exp(-2 pi zeta n) in n periods.
TEST(Hanging, DampedSwingDecaysAsSaid) {
  const double length = 0.2;
  const double zeta = 0.05;
  Hung h = Hung::held(3, length);
  const double w = std::sqrt(kGravity / length);
  h.around.hanging.across = 2 * zeta * 3 * w;
  h.state.swing.place = {0.01, 0, -std::sqrt(length * length - 1e-4)};
  const double dt = 1e-4;
  double most = 0;
  const auto steps = std::lround(6 * 2 * std::numbers::pi / w / dt);
  for (long k = 0; k < steps; ++k) {
    h.step(dt);
    if (k > steps - steps / 24) most = std::max(most, std::fabs(h.state.swing.place.x));
  }
  EXPECT_NEAR(most / 0.01, std::exp(-2 * std::numbers::pi * zeta * 6), 0.01);
}

// In the air trunk and load have only gravity: their common momentum is m g t to rounding, and no energy
// comes from nowhere (the strap's damping takes some).
TEST(Hanging, TrunkAndLoadKeepTheirMomentumAndWinNoEnergy) {
  Hung h(9, 4, 0.2);
  h.around.hanging.at = {0.1, 0.05, 0.06};
  h.state.rate = {2, -1, 3};
  h.state.velocity = {0.5, -0.3, 4};
  h.state.swing.place = {0.25, 0.05, -0.06};
  h.state.swing.velocity = {0, 1, 4};
  const V3 before = h.state.velocity * 9.0 + h.state.swing.velocity * 4.0;
  for (int k = 0; k < 1000; ++k) h.step(1e-3);
  const V3 after = h.state.velocity * 9.0 + h.state.swing.velocity * 4.0;
  EXPECT_NEAR(after.x, before.x, 1e-9);
  EXPECT_NEAR(after.y, before.y, 1e-9);
  EXPECT_NEAR(after.z, before.z - 13 * kGravity, 1e-8);
}

// The strap's own damping takes a little as its tension goes up and down with the swing; nothing else does.
TEST(Hanging, UndampedSwingKeepsItsEnergy) {
  Hung h = Hung::held(3, 0.25);
  const double a = 0.5;
  h.state.swing.place = {0.25 * std::sin(a), 0, -0.25 * std::cos(a)};
  const auto energy = [&] {
    const auto& s = h.state.swing;
    const double stretch = std::max(std::sqrt(dot(s.place, s.place)) - h.around.hanging.length, 0.0);
    return 3 * (dot(s.velocity, s.velocity) / 2 + kGravity * s.place.z) +
           h.around.hanging.stiffness * stretch * stretch / 2;
  };
  for (int k = 0; k < 200; ++k) h.step(1e-3);  // the strap's settling is over
  const double before = energy();
  for (int k = 0; k < 4000; ++k) h.step(1e-3);
  const double swing = 3 * kGravity * 0.25 * (1 - std::cos(a));
  EXPECT_NEAR(energy(), before, 0.01 * swing);
}

// However heavy the load and light the trunk, a millisecond is short enough: nothing rings and no energy
// comes in, also where the strap is held far out on a spinning trunk.
TEST(Hanging, IsCalmAtAMillisecond) {
  for (const double load : {0.1, 5.0, 100.0}) {
    Hung h(2, load, 0.05);
    h.around.hanging.at = {0.2, 0.1, 0};
    h.state.swing.place = {0.2, 0.1, -0.05};
    h.state.rate = {1, 2, -1};
    const double before = h.energy();
    for (int k = 0; k < 2000; ++k) {
      h.step(1e-3);
      ASSERT_LT(h.energy(), before + 0.05 * std::fabs(before) + 0.05) << load << " at " << k;
    }
  }
}

TEST(Hanging, ASlackStrapDoesNothing) {
  Hung h = Hung::held(3, 0.2);
  h.state.swing.place = {0, 0, -0.1};
  h.state.swing.velocity = {0, 0, 0};
  for (int k = 0; k < 100; ++k) h.step(1e-3);
  EXPECT_NEAR(h.state.swing.velocity.z, -kGravity * 0.1, 1e-9);
}

}  // namespace
}  // namespace pastern::stub
