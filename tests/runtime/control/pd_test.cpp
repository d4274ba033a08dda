// The PD law on one joint of inertia J against second-order theory: Ogata, Modern Control Engineering, ch. 5
// (from memory; formulas for overshoot and peak time seen in a public control wiki). Numbers computed with
// SciPy.
#include "runtime/control/pd.h"

#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <limits>

#include "tests/runtime/support/robots.h"

namespace pastern::control {
namespace {

struct Loop {
  double kp;
  double kd;
  double inertia;
};

double torque_of(const Loop& loop, double target, double angle, double speed) {
  Gains<double> gains;
  gains.joint_count = 1;
  gains.stiffness[0] = loop.kp;
  gains.damping[0] = loop.kd;
  JointTarget<> wanted;
  JointAngles<> at;
  JointSpeeds<> moves;
  wanted.angle[0] = target;
  at[0] = angle;
  moves[0] = speed;
  return pd_torques(gains, wanted, at, moves)[0];
}

struct State {
  double angle{0};
  double speed{0};
};

/// Exact solution of J q'' = torque over a step with the torque held.
State held(const State& state, double torque, double inertia, double h) {
  const double acceleration = torque / inertia;
  return {state.angle + state.speed * h + 0.5 * acceleration * h * h, state.speed + acceleration * h};
}

struct Response {
  double overshoot{0};
  double peak_s{0};
  double settle2_s{0};
  double settle5_s{0};
};

/// Step of one radian; the law is sampled at `h`, 0.1 ms and less: the continuous loop but for O(h).
Response step_response(const Loop& loop, double h, double until_s) {
  Response response;
  State state;
  double top = 0;
  for (int i = 1; i * h <= until_s; ++i) {
    // The mid-step value of a held torque: half a step ahead, so that holding it adds no delay.
    const State half = held(state, torque_of(loop, 1, state.angle, state.speed), loop.inertia, h / 2);
    state = held(state, torque_of(loop, 1, half.angle, half.speed), loop.inertia, h);
    if (state.angle > top) {
      top = state.angle;
      response.peak_s = i * h;
    }
    if (std::abs(state.angle - 1) > 0.02) {
      response.settle2_s = i * h;
    }
    if (std::abs(state.angle - 1) > 0.05) {
      response.settle5_s = i * h;
    }
  }
  response.overshoot = top - 1;
  return response;
}

Loop loop_of(double zeta, double wn) {
  const double inertia = 0.02;
  return {inertia * wn * wn, 2 * zeta * wn * inertia, inertia};
}

TEST(PdLoop, WorkedExampleOfTheTextbook) {
  // zeta 0.6, wn 5 rad/s: tp 0.785 s, Mp 9.5 % (Ogata, Example 5-1).
  const Response response = step_response(loop_of(0.6, 5), 1e-4, 3);
  EXPECT_NEAR(response.peak_s, 0.7854, 1e-4);
  EXPECT_NEAR(100 * response.overshoot, 9.478, 0.1);
}

TEST(PdLoop, OvershootPeakAndSettlingOverTheDampingRatio) {
  // zeta, overshoot %, wn tp, exact wn ts(2 %), exact wn ts(5 %).
  const std::array<std::array<double, 5>, 9> table{{{.1, 72.925, 3.157, 38.38, 28.97},
                                                    {.2, 52.662, 3.206, 19.60, 13.74},
                                                    {.3, 37.233, 3.293, 11.23, 10.14},
                                                    {.4, 25.383, 3.428, 8.41, 7.61},
                                                    {.5, 16.303, 3.628, 8.076, 5.289},
                                                    {.6, 9.478, 3.927, 5.943, 5.229},
                                                    {.7, 4.599, 4.399, 5.979, 2.900},
                                                    {.8, 1.517, 5.236, 3.756, 3.385},
                                                    {.9, .152, 7.207, 4.700, 4.014}}};
  for (const auto& [zeta, overshoot, peak, settle2, settle5] : table) {
    const double wn = 10;
    const Response response = step_response(loop_of(zeta, wn), 1e-4, 6);
    EXPECT_NEAR(100 * response.overshoot, overshoot, 0.1) << zeta;
    // The top is flat: where it is to a step of h, its height to rounding; the table has four digits.
    EXPECT_NEAR(wn * response.peak_s, peak, 0.003) << zeta;
    EXPECT_NEAR(wn * response.settle2_s, settle2, 0.011) << zeta;
    EXPECT_NEAR(wn * response.settle5_s, settle5, 0.011) << zeta;
  }
}

TEST(PdLoop, CriticallyDampedSettlesInTheTabledTime) {
  const Response response = step_response(loop_of(1, 10), 1e-4, 4);
  EXPECT_NEAR(10 * response.settle2_s, 5.8339, 0.002);
  EXPECT_NEAR(10 * response.settle5_s, 4.7439, 0.002);
  EXPECT_LE(response.overshoot, 0.0);
}

TEST(PdLoop, NaturalFrequencyAndDampingOfGivenGains) {
  // kp, kd, J -> wn, zeta: the free decay's peak time and overshoot must be those.
  const std::array<std::array<double, 5>, 4> table{{{100, 2, .02, 70.7107, .707107},
                                                    {20, .5, .0125, 40, .5},
                                                    {50, 1, .04, 35.3553, .353553},
                                                    {40, 1, .01, 63.2456, .790569}}};
  for (const auto& [kp, kd, inertia, wn, zeta] : table) {
    const double root = std::sqrt(1 - zeta * zeta);
    const Response response = step_response({kp, kd, inertia}, 1e-5, 0.4);
    EXPECT_NEAR(response.peak_s, M_PI / (wn * root), 2e-5);
    EXPECT_NEAR(response.overshoot, std::exp(-M_PI * zeta / root), 1e-3);
  }
}

TEST(PdLoop, StaticErrorUnderConstantTorque) {
  // 5 N m against 40 N m/rad: 0.125 rad (7.162 degrees).
  const Loop loop{40, 1, 0.01};
  State state;
  for (int i = 0; i < 20000; ++i) {
    state = held(state, torque_of(loop, 0, state.angle, state.speed) + 5, loop.inertia, 1e-4);
  }
  EXPECT_NEAR(state.angle, 0.125, 1e-9);
  EXPECT_NEAR(state.angle * 180 / M_PI, 7.162, 5e-4);
}

/// Largest |eigenvalue| of the sampled loop with the torque held for h and late by `delay` samples. The
/// loop's matrix is read off the law itself, column by column.
double spectral_radius(const Loop& loop, double h, int delay) {
  const int size = 2 + delay;
  Eigen::MatrixXd matrix = Eigen::MatrixXd::Zero(size, size);
  for (int column = 0; column < size; ++column) {
    Eigen::VectorXd state = Eigen::VectorXd::Zero(size);
    state(column) = 1;
    const double fresh = torque_of(loop, 0, state(0), state(1));
    const State next = held({state(0), state(1)}, delay == 0 ? fresh : state(size - 1), loop.inertia, h);
    matrix(0, column) = next.angle;
    matrix(1, column) = next.speed;
    for (int i = 2; i < size; ++i) {
      matrix(i, column) = i == 2 ? fresh : state(i - 1);
    }
  }
  return matrix.eigenvalues().cwiseAbs().maxCoeff();
}

/// Smallest period at which the loop is no longer stable, by bisection.
double critical_period(const Loop& loop, int delay, double low, double high) {
  for (int i = 0; i < 60; ++i) {
    const double middle = 0.5 * (low + high);
    (spectral_radius(loop, middle, delay) < 1 ? low : high) = middle;
  }
  return low;
}

TEST(SampledPdLoop, CriticalPeriodOfTheHeldLoop) {
  // Jury: stable iff kp > 0, kd > kp h / 2, kd h / J < 2.
  EXPECT_NEAR(critical_period({100, 2, .02}, 0, 1e-3, 0.1), 0.020, 0.020 * 1e-6);
  EXPECT_NEAR(critical_period({100, .2, .02}, 0, 1e-3, 0.1), 0.004, 0.004 * 1e-6);
}

TEST(SampledPdLoop, CriticalPeriodWithWholeSamplesOfDelay) {
  EXPECT_NEAR(critical_period({100, 2, .02}, 1, 1e-4, 0.1), 6.988e-3, 2e-6);
  EXPECT_NEAR(critical_period({100, 2, .02}, 2, 1e-4, 0.1), 4.175e-3, 2e-6);
  EXPECT_NEAR(critical_period({100, 2, .02}, 3, 1e-4, 0.1), 2.978e-3, 2e-6);
}

TEST(SampledPdLoop, PureDampingWithDelayFollowsTheSineLaw) {
  // kd h / J < 2 sin(pi / (2 (2 d + 1))); the stiffness is nothing but not zero, so that the angle is no
  // eigenvalue 1.
  for (int delay = 0; delay < 5; ++delay) {
    const double bound = 2 * std::sin(M_PI / (2 * (2 * delay + 1)));
    const double h = 1e-3;
    const double inertia = 0.02;
    EXPECT_LT(spectral_radius({1e-9, (bound - 1e-3) * inertia / h, inertia}, h, delay), 1.0) << delay;
    EXPECT_GT(spectral_radius({1e-9, (bound + 1e-3) * inertia / h, inertia}, h, delay), 1.0) << delay;
  }
}

TEST(SampledPdLoop, ShippedGainsAreStableAtTheirCycleWithThreeTicksOfDelay) {
  // On the rotor alone, the least inertia that a joint can show (a leg in the air only adds to it).
  for (const char* name : {"dunlin8", "dunlin12"}) {
    const v1::Robot robot = test::shipped_robot(name).robot();
    const Gains<double> gains = gains_of(robot);
    ASSERT_EQ(gains.joint_count, robot.joints_size());
    for (int j = 0; j < robot.joints_size(); ++j) {
      const auto i = static_cast<std::size_t>(j);
      EXPECT_EQ(gains.stiffness[i], robot.joints(j).stiffness_nm_per_rad());
      EXPECT_EQ(gains.damping[i], robot.joints(j).damping_nm_s_per_rad());
      const Loop loop{gains.stiffness[i], gains.damping[i], robot.joints(j).drive().rotor_inertia_kg_m2()};
      EXPECT_LT(spectral_radius(loop, 1 / robot.cycle_hz(), 3), 1.0) << robot.joints(j).name();
    }
  }
}

TEST(PdTorques, JointsBeyondTheCountGetNone) {
  Gains<double> gains;
  gains.joint_count = 2;
  gains.stiffness.fill(100);
  JointTarget<> target;
  target.angle.values.fill(1);
  const Torques<> torque = pd_torques(gains, target, JointAngles<>{}, JointSpeeds<>{});
  EXPECT_EQ(torque[1], 100);
  EXPECT_EQ(torque[2], 0);
}

TEST(PdTorques, NotANumberPassesToTheGate) {
  Gains<double> gains;
  gains.joint_count = 2;
  gains.stiffness.fill(100);
  JointTarget<> target;
  target.angle[1] = std::numeric_limits<double>::quiet_NaN();
  const Torques<> torque = pd_torques(gains, target, JointAngles<>{}, JointSpeeds<>{});
  EXPECT_EQ(torque[0], 0);
  EXPECT_TRUE(std::isnan(torque[1]));
}

}  // namespace
}  // namespace pastern::control
