// The body's motion against closed forms and conservation laws. Sources stand beside the checks.
#include <gtest/gtest.h>

#include "tests/hal_stub/bodies.h"

namespace pastern::stub {
namespace {

constexpr double kPi = 3.14159265358979323846;

/// A trunk so heavy that nothing moves it, held up against gravity: what hangs on it moves as on a fixed
/// base.
TreeD fixed_base(int joints) {
  TreeD tree;
  tree.joint_count = joints;
  tree.leg_count = 1;
  tree.trunk.mass = 1e12;
  tree.trunk.inertia = {1e12, 1e12, 1e12, 0, 0, 0};
  tree.leg[0].joint_count = joints;
  return tree;
}

Surroundings<double> held_up(const TreeD& tree) {
  Surroundings<double> around = in_the_air(tree);
  around.push = {0, 0, tree.trunk.mass * tree.gravity};
  return around;
}

struct Trial {
  TreeD tree;
  Surroundings<double> around;
  StateD state;
  Work<double> work{};
  Loads<double> loads{};

  void step(double dt) { step_body(tree, around, loads, dt, state, work); }
  void go(double seconds, double dt) {
    const auto steps = static_cast<long>(std::lround(seconds / dt));
    for (long k = 0; k < steps; ++k) step(dt);
  }
};

Trial hanging_rod(double length, double amplitude) {
  Trial run;
  run.tree = fixed_base(1);
  run.tree.gravity = 9.80665;
  run.tree.leg[0].joint[0] = hinge(AxisKind::y, {0, 0, 0}, 1, {0, 0, -length / 2},
                                   {length * length / 12, length * length / 12, 1e-9});
  run.around = held_up(run.tree);
  run.state.angle[0][0] = amplitude;
  return run;
}

/// Time from rest at one end to the turn at the other, twice.
double period_of(Trial run, double dt) {
  double time = 0;
  double before = 0;
  for (;;) {
    before = run.state.speed[0][0];
    run.step(dt);
    time += dt;
    if (before < 0 && run.state.speed[0][0] >= 0)
      return 2 * (time - dt * run.state.speed[0][0] / (run.state.speed[0][0] - before));
  }
}

// Source: T/T0 = (2/pi) K(sin(a/2)), values by SciPy, GSL and Boost; uniform rod on its end T0 = 2 pi sqrt(2
// L / 3 g), g = 9.80665: L = 1 m 1.6382263273 s.
TEST(Laws, RodSwingsWithThePeriodOfTheEllipticIntegral) {
  const double t0 = 1.6382263273;
  EXPECT_NEAR(period_of(hanging_rod(1, 10 * kPi / 180), 2e-5) / t0, 1.0019071881, 1e-4);
  EXPECT_NEAR(period_of(hanging_rod(1, 90 * kPi / 180), 2e-5) / t0, 1.1803405990, 1e-4);
  EXPECT_NEAR(period_of(hanging_rod(1, 150 * kPi / 180), 2e-5) / t0, 1.7622037295, 1e-3);
  EXPECT_NEAR(period_of(hanging_rod(0.3, 1 * kPi / 180), 2e-5), 0.8972935138 * 1.0000190389, 1e-4);
}

Trial two_links() {
  Trial run;
  run.tree = fixed_base(2);
  run.tree.gravity = 9.81;
  return run;
}

// Source: closed form of two uniform rods, m = l = 1 (Craig; Spong), q = (30, 45 deg) from the horizontal,
// evaluated.
TEST(Laws, TwoLinkArmAcceleratesAsTheClosedFormSays) {
  Trial run = two_links();
  const double i = 1.0 / 12;
  run.tree.leg[0].joint[0] = hinge(AxisKind::y, {0, 0, 0}, 1, {0.5, 0, 0}, {1e-9, i, i});
  run.tree.leg[0].joint[1] = hinge(AxisKind::y, {1, 0, 0}, 1, {0.5, 0, 0}, {1e-9, i, i});
  // The arm's angles rise against gravity; about y they are negative.
  for (auto& joint : run.tree.leg[0].joint) {
    joint.axis = {0, -1, 0};
    joint.sign = -1;
  }
  run.around = held_up(run.tree);
  run.state.angle[0] = {30 * kPi / 180, 45 * kPi / 180, 0, 0};
  run.state.speed[0] = {0.7, -0.4, 0, 0};
  begin_step(run.tree, run.around.trunk, run.state, run.work);
  EXPECT_NEAR(run.work.leg[0].inertia[0][0], 2.373773447853, 1e-9);
  EXPECT_NEAR(run.work.leg[0].inertia[1][0], 0.686886723927, 1e-9);
  EXPECT_NEAR(run.work.leg[0].inertia[1][1], 0.333333333333, 1e-9);
  add_push(run.around, run.work);
  solve(run.tree, run.work);
  EXPECT_NEAR(run.work.leg[0].acceleration[0], -11.667629277, 1e-8);
  EXPECT_NEAR(run.work.leg[0].acceleration[1], 19.714773218, 1e-8);
}

// Source: point masses m = l = 1, g = 9.81, from 120 and -10 deg at rest, by a Runge-Kutta of order 8 at
// 1e-13.
TEST(Laws, DoublePendulumIsWhereAnIntegratorOfHighOrderPutsIt) {
  Trial run = two_links();
  run.tree.leg[0].joint[0] = hinge(AxisKind::y, {0, 0, 0}, 1, {0, 0, -1}, {1e-12, 1e-12, 1e-12});
  run.tree.leg[0].joint[1] = hinge(AxisKind::y, {0, 0, -1}, 1, {0, 0, -1}, {1e-12, 1e-12, 1e-12});
  run.around = held_up(run.tree);
  const double first = 120 * kPi / 180;
  run.state.angle[0] = {first, -10 * kPi / 180 - first, 0, 0};
  run.go(0.5, 1e-6);
  EXPECT_NEAR(run.state.angle[0][0], 0.8961958618, 1e-4);
  EXPECT_NEAR(run.state.angle[0][0] + run.state.angle[0][1], -0.0753286369, 1e-4);
  EXPECT_NEAR(run.state.speed[0][0], -5.1270575559, 1e-4);
}

Trial single_body(const V3& inertia) {
  Trial run;
  run.tree.trunk.mass = 1;
  run.tree.trunk.inertia = {inertia.x, inertia.y, inertia.z, 0, 0, 0};
  run.tree.gravity = 0;
  run.around = in_the_air(run.tree);
  return run;
}

// Source: Euler's equations, symmetric top I = (2, 2, 1), w = (1, 0, 5): body precession -2.5 rad/s.
TEST(Laws, SymmetricTopPrecesses) {
  Trial run = single_body({2, 2, 1});
  run.state.rate = {1, 0, 5};
  run.go(1, 1e-5);
  EXPECT_NEAR(run.state.rate.x, -0.8011436155, 1e-4);
  EXPECT_NEAR(run.state.rate.y, -0.5984721441, 1e-4);
  EXPECT_NEAR(run.state.rate.z, 5, 1e-9);
}

// Source: Runge-Kutta of order 8 and Jacobi's functions (Landau and Lifshitz, Mechanics, sec. 37, from
// memory).
TEST(Laws, AsymmetricTopTumbles) {
  Trial run = single_body({1, 2, 3});
  run.state.rate = {0.01, 1, 0.01};
  run.go(5, 1e-5);
  EXPECT_NEAR(run.state.rate.x, -0.0648296170, 1e-5);
  EXPECT_NEAR(run.state.rate.y, 0.9979464519, 1e-5);
  EXPECT_NEAR(run.state.rate.z, 0.0383096125, 1e-5);
}

Trial tumbling() {
  Trial run;
  run.tree = reference_tree();
  run.around = in_the_air(run.tree);
  run.state.attitude = {0.8, 0.36, -0.48, 0};
  run.state.rate = {0.5, -0.8, 1.1};
  run.state.velocity = {0.4, 0.1, -0.2};
  for (std::size_t l = 0; l < 4; ++l) {
    const double s = static_cast<double>(l);
    run.state.angle[l] = {0.1 * s, 0.6 - 0.1 * s, -1.2, 0};
    run.state.speed[l] = {0.5 - 0.3 * s, 1 - 0.4 * s, -1.5 + s, 0};
  }
  return run;
}

struct Drift {
  double momentum;
  double spin;
  double energy;
};

Drift drift_after(double seconds, double dt) {
  Trial run = tumbling();
  const Totals before = totals(run.tree, run.state);
  run.go(seconds, dt);
  const Totals after = totals(run.tree, run.state);
  const double g = run.tree.gravity;
  const V3 dp = after.momentum - before.momentum + V3{0, 0, after.mass * g * seconds};
  const V3 dh = after.spin - before.spin;
  return {std::sqrt(dot(dp, dp)), std::sqrt(dot(dh, dh)),
          std::fabs(after.kinetic + after.potential - before.kinetic - before.potential)};
}

// Source: Newton and Euler: in free flight momentum changes by m g t, angular momentum about the centre of
// mass and energy stay. The step is semi-implicit Euler: errors of first order, so halving the step halves
// them.
TEST(Laws, FreeFlightKeepsMomentumSpinAndEnergyToFirstOrder) {
  const Drift coarse = drift_after(0.4, 4e-4);
  const Drift fine = drift_after(0.4, 1e-4);
  EXPECT_LT(fine.momentum, 2e-2);
  EXPECT_LT(fine.spin, 2e-3);
  EXPECT_LT(fine.energy, 5e-2);
  for (const double ratio :
       {coarse.momentum / fine.momentum, coarse.spin / fine.spin, coarse.energy / fine.energy}) {
    EXPECT_GT(ratio, 3);  // 4 for first order
    EXPECT_LT(ratio, 5.5);
  }
}

/// A block whose eight corners all lie at its centre: one point on the ground.
Trial point_on_ground(double mass, double stiffness, double damping) {
  Trial run;
  run.tree.trunk.mass = mass;
  run.tree.trunk.inertia = {1, 1, 1, 0, 0, 0};
  run.tree.gravity = 9.81;
  run.around = in_the_air(run.tree);
  run.around.ground.stiffness = stiffness / kTrunkCorners;
  run.around.ground.damping = damping / kTrunkCorners;
  run.tree.half_size = {1e-9, 1e-9, 1e-9};
  return run;
}

// Source: Hooke: static depth m g / k: 1 kg on 1e4 N/m 0.000981 m.
TEST(Laws, RestsAtTheStaticDepth) {
  Trial run = point_on_ground(1, 1e4, 40);
  run.go(2, 1e-3);
  EXPECT_NEAR(run.state.position.z, -0.000981, 1e-9);
  EXPECT_NEAR(run.state.velocity.z, 0, 1e-9);
}

// Source: undamped spring contact of 1 kg on 1e4 N/m at 1 m/s without gravity: depth v sqrt(m/k) = 0.01 m,
// time pi sqrt(m/k) = 0.0314159265 s.
TEST(Laws, BouncesOnASpring) {
  Trial run = point_on_ground(1, 1e4, 0);
  run.tree.gravity = 0;
  run.state.velocity.z = -1;
  double deepest = 0;
  double time = 0;
  const double dt = 2e-6;
  run.step(dt);
  while (run.state.position.z < 0) {
    run.step(dt);
    time += dt;
    deepest = std::min(deepest, run.state.position.z);
  }
  EXPECT_NEAR(deepest, -0.01, 2e-5);
  EXPECT_NEAR(time, 0.0314159265, 5e-5);
  EXPECT_NEAR(run.state.velocity.z, 1, 1e-3);
}

Trial block_on_slope(double slope, double friction) {
  Trial run;
  run.tree.trunk.mass = 2;
  run.tree.trunk.inertia = {0.02, 0.02, 0.02, 0, 0, 0};
  run.tree.gravity = 9.81;
  run.around = in_the_air(run.tree);
  run.around.ground.normal = {-std::sin(slope), 0, std::cos(slope)};
  run.around.ground.friction = friction;
  run.around.ground.stiffness = 24000;
  run.around.ground.damping = 400;
  run.tree.half_size = {0.2, 0.2, 0.02};
  for (std::size_t c = 0; c < kTrunkCorners; ++c) {
    run.tree.corner[c] = {(c & 1U) != 0 ? 0.2 : -0.2, (c & 2U) != 0 ? 0.2 : -0.2,
                          (c & 4U) != 0 ? 0.02 : -0.02};
  }
  run.state.attitude = {std::cos(slope / 2), 0, -std::sin(slope / 2), 0};
  run.state.position = run.around.ground.normal * 0.02;
  return run;
}

double speed_along(const Trial& run, double slope) {
  return run.state.velocity.x * std::cos(slope) + run.state.velocity.z * std::sin(slope);
}

// Source: Coulomb: 20 deg, friction 0.2: 1.5115406840 m/s2 down the slope (g = 9.81).
TEST(Laws, BlockSlidesDownASlopeWithTheAccelerationOfCoulomb) {
  const double slope = 20 * kPi / 180;
  Trial run = block_on_slope(slope, 0.2);
  run.go(1, 1e-3);
  const double v1 = speed_along(run, slope);
  run.go(1, 1e-3);
  EXPECT_NEAR((v1 - speed_along(run, slope)) / 1.0, 1.5115406840, 0.01);
}

// Source: slip angle atan(0.3) = 16.699244 deg. Below it only the creep of the regularised law is left.
TEST(Laws, BlockSlipsAboveTheFrictionAngleAndCreepsBelow) {
  const double angle = 16.699244 * kPi / 180;
  Trial below = block_on_slope(angle * 0.98, 0.3);
  below.go(3, 1e-3);
  EXPECT_LT(std::fabs(speed_along(below, angle * 0.98)), below.around.ground.stick_speed);
  Trial above = block_on_slope(angle * 1.02, 0.3);
  above.go(3, 1e-3);
  EXPECT_GT(std::fabs(speed_along(above, angle * 1.02)), 2 * above.around.ground.stick_speed);
}

// Source: v^2 / (2 mu g): from 1 m/s with 0.3 0.1698946653 m (g = 9.81).
TEST(Laws, BlockStopsAfterTheDistanceOfCoulomb) {
  Trial run = block_on_slope(0, 0.3);
  run.go(0.2, 1e-3);
  const double from = run.state.position.x;
  run.state.velocity.x = 1;
  run.go(1, 1e-3);
  EXPECT_NEAR(run.state.position.x - from, 0.1698946653, 0.003);
}

// The contact is linearly implicit: far beyond the explicit limit (2 sqrt(m/k) = 9 ms for the trunk's point,
// under 2 ms for a light foot) nothing blows up.
TEST(Laws, StiffGroundIsStableAtOneMillisecond) {
  for (const double stiffness : {24000.0, 240000.0, 2.4e6}) {
    Trial run = point_on_ground(0.05, stiffness, 400);
    run.state.position.z = 0.05;
    run.go(2, 1e-3);
    // Within two falls of one step (g dt^2), the least that a contact noticed at the begin of a step can do.
    EXPECT_NEAR(run.state.position.z, -0.05 * 9.81 / stiffness, 2 * 9.81e-6) << stiffness;
  }
}

TEST(Laws, SineAndCosineAreThoseOfTheLibrary) {
  for (int i = -130000; i <= 130000; ++i) {
    const double x = i * 1e-4;
    const auto sc = sin_cos(x);
    ASSERT_NEAR(sc.sin, std::sin(x), 4e-16) << x;
    ASSERT_NEAR(sc.cos, std::cos(x), 4e-16) << x;
    const auto f = sin_cos(static_cast<float>(x));
    ASSERT_NEAR(f.sin, std::sin(static_cast<float>(x)), 3e-7F) << x;
  }
}

}  // namespace
}  // namespace pastern::stub
