// The body's equations of motion against numbers made by two independent programs (source:
// floating_vector.h).
#include <gtest/gtest.h>

#include "tests/hal_stub/bodies.h"
#include "tests/hal_stub/floating_vector.h"

namespace pastern::stub {
namespace {

constexpr double kTolerance = 1e-8;  // relative; the figures were printed with 12 digits and more

Rotation<double> base_axes() {
  const auto& r = reference::kBaseAxes;
  return {{r[0][0], r[1][0], r[2][0]}, {r[0][1], r[1][1], r[2][1]}, {r[0][2], r[1][2], r[2][2]}};
}

StateD reference_state() {
  StateD s;
  // Yaw 30, pitch 20, roll 10 degrees: q = qz qy qx (checked against the matrix below).
  const double d = std::acos(-1.0) / 360;
  const Quat<double> z{std::cos(30 * d), 0, 0, std::sin(30 * d)};
  const Quat<double> y{std::cos(20 * d), 0, std::sin(20 * d), 0};
  const Quat<double> x{std::cos(10 * d), std::sin(10 * d), 0, 0};
  s.attitude = z * y * x;
  s.position = {reference::kPosition[0], reference::kPosition[1], reference::kPosition[2]};
  s.velocity = {reference::kVelocity[0], reference::kVelocity[1], reference::kVelocity[2]};
  s.rate = turn_back(base_axes(), V3{reference::kRate[0], reference::kRate[1], reference::kRate[2]});
  for (std::size_t j = 0; j < 12; ++j) {
    s.angle[j / 3][j % 3] = reference::kAngle[j];
    s.speed[j / 3][j % 3] = reference::kSpeed[j];
  }
  return s;
}

/// Accelerations as in the vector: base in world axes, then joints.
std::array<double, 18> told(const Work<double>& work) {
  const auto r = base_axes();
  const auto* a = work.acceleration;
  const V3 turning = r * V3{a[0], a[1], a[2]};
  const V3 moving = r * V3{a[3], a[4], a[5]};
  std::array<double, 18> all{turning.x, turning.y, turning.z, moving.x, moving.y, moving.z};
  for (std::size_t j = 0; j < 12; ++j) all[6 + j] = work.leg[j / 3].acceleration[j % 3];
  return all;
}

void expect_near_relative(const std::array<double, 18>& found, const std::array<double, 18>& expected) {
  for (std::size_t i = 0; i < 18; ++i) {
    EXPECT_NEAR(found[i], expected[i], kTolerance * std::max(1.0, std::fabs(expected[i]))) << "entry " << i;
  }
}

void drive(Work<double>& work) {
  for (std::size_t j = 0; j < 12; ++j) work.leg[j / 3].force[j % 3] += reference::kTorque[j];
}

/// A force in world axes at a foot's centre.
void press_foot(Work<double>& work, std::size_t leg, const V3& force) {
  const V3 f = turn_back(base_axes(), force);
  const V3 r = work.leg[leg].foot;
  const auto arm = arms_of<3>(work.leg[leg], r);
  const Touch<double> touch{f, 0, 0};
  press_leg<3>(touch, V3{0, 0, 1}, r, arm, 0.001, work.leg[leg]);
  press_trunk(touch, V3{0, 0, 1}, r, 0.001, work);
}

TEST(DynamicsVector, AttitudeOfThePrintedQuaternionIsThePrintedMatrix) {
  const auto made = rotation_of(reference_state().attitude);
  const auto printed = base_axes();
  EXPECT_NEAR(made.x.x, printed.x.x, 1e-12);
  EXPECT_NEAR(made.x.z, printed.x.z, 1e-12);
  EXPECT_NEAR(made.y.z, printed.y.z, 1e-12);
  EXPECT_NEAR(made.z.y, printed.z.y, 1e-12);
}

TEST(DynamicsVector, AccelerationsInFreeFlightAgree) {
  const TreeD tree = reference_tree();
  const StateD state = reference_state();
  Work<double> work{};
  begin_step(tree, trunk_of(tree), state, work);
  drive(work);
  solve(tree, work);
  expect_near_relative(told(work), reference::kFree);
}

TEST(DynamicsVector, AccelerationsWithForcesOnTwoFeetAgree) {
  const TreeD tree = reference_tree();
  const StateD state = reference_state();
  Work<double> work{};
  begin_step(tree, trunk_of(tree), state, work);
  drive(work);
  press_foot(work, 0, {5, -3, 60});
  press_foot(work, 3, {-4, 2, 70});
  solve(tree, work);
  expect_near_relative(told(work), reference::kPressed);
}

TEST(DynamicsVector, AHingeAboutAnyAxisMovesLikeOneAboutANamedAxis) {
  TreeD tree = reference_tree();
  for (auto& leg : tree.leg) {
    for (auto& joint : leg.joint) joint.kind = AxisKind::any;
  }
  const StateD state = reference_state();
  Work<double> work{};
  begin_step(tree, trunk_of(tree), state, work);
  drive(work);
  solve(tree, work);
  expect_near_relative(told(work), reference::kFree);
}

TEST(DynamicsVector, EveryEntryOfTheMassMatrixAgrees) {
  const TreeD tree = reference_tree();
  const StateD state = reference_state();
  Work<double> work{};
  begin_step(tree, trunk_of(tree), state, work);
  const auto r = base_axes();
  for (std::size_t l = 0; l < 4; ++l) {
    for (std::size_t i = 0; i < 3; ++i) {
      const std::size_t row = 6 + 3 * l + i;
      for (std::size_t j = 0; j <= i; ++j) {
        EXPECT_NEAR(work.leg[l].inertia[i][j], reference::kMass[row][6 + 3 * l + j], 1e-10);
      }
      const V3 turning = r * work.leg[l].turning[i];
      const V3 moving = r * work.leg[l].moving[i];
      const double coupling[6] = {turning.x, turning.y, turning.z, moving.x, moving.y, moving.z};
      for (std::size_t c = 0; c < 6; ++c) EXPECT_NEAR(coupling[c], reference::kMass[row][c], 1e-10);
    }
  }
  double base = 0;
  for (std::size_t i = 0; i < 3; ++i) base += reference::kMass[i][i];
  EXPECT_NEAR(work.inertia[0][0] + work.inertia[1][1] + work.inertia[2][2], base, 1e-10);
  EXPECT_NEAR(work.inertia[3][3], reference::kMass[3][3], 1e-10);
}

TEST(DynamicsVector, EnergyMomentumAndCentreAgree) {
  const TreeD tree = reference_tree();
  const Totals t = totals(tree, reference_state());
  // Source of the figures: as above; potential energy is m g z of the centre of mass.
  EXPECT_NEAR(t.mass, 19.6, 1e-12);
  EXPECT_NEAR(t.kinetic, 2.42490492189, 1e-10);
  EXPECT_NEAR(t.potential, 93.97205241209, 1e-9);
  EXPECT_NEAR(t.centre.x, 0.284966198714, 1e-11);
  EXPECT_NEAR(t.momentum.x, 7.99829025891, 1e-10);
  EXPECT_NEAR(t.momentum.z, -3.73200561021, 1e-10);
  EXPECT_NEAR(t.spin.x, 0.186158713731, 1e-11);
  EXPECT_NEAR(t.spin.y, -0.28231689747, 1e-11);
  EXPECT_NEAR(t.spin.z, 0.617455394624, 1e-11);
}

TEST(DynamicsVector, FootPlaceAndVelocityAgree) {
  const TreeD tree = reference_tree();
  const StateD state = reference_state();
  Work<double> work{};
  begin_step(tree, trunk_of(tree), state, work);
  const auto& leg = work.leg[0];
  const V3 place = state.position + base_axes() * leg.foot;
  EXPECT_NEAR(place.x, 0.233824579874, 1e-11);
  EXPECT_NEAR(place.y, 0.0781045466713, 1e-11);
  EXPECT_NEAR(place.z, 0.139825283078, 1e-11);
  const auto arm = arms_of<3>(leg, leg.foot);
  const V3 v = base_axes() * velocity_at<3>(work, state.rate, leg.foot, arm, state.speed[0]);
  EXPECT_NEAR(v.x, 0.224924755025, 1e-10);
  EXPECT_NEAR(v.y, 0.336133051838, 1e-10);
  EXPECT_NEAR(v.z, -0.291937761193, 1e-10);
}

}  // namespace
}  // namespace pastern::stub
