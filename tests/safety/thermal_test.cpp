// The first-order thermal model against the tripping times of IEC 60255-149:
//   t = tau ln((I^2 - Ip^2) / (I^2 - (k IB)^2))
// (equation and hot form as printed in Handbook of Electrical Engineering, Sheldrake, Wiley, section 12.7.1).
#include "safety/thermal.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <limits>

namespace pastern::safety {
namespace {

constexpr double kTau = 600.0;
constexpr double kRated = 10.0;  // N m, in the place of k*IB

/// Seconds until theta reaches 1 at the load (a fraction of IB), after a long time at `before`.
double seconds_to_limit(double load, double before, double k, double period_s) {
  ThermalModel model;
  PerJoint<Celsius> start;
  start[0] = (before / k) * (before / k);
  model.restore(start);
  double t = 0.0;
  while (model.theta(0) < 1.0 && t < 10.0 * kTau) {
    model.step(0, load / k * kRated, kRated, kTau, period_s);
    t += period_s;
  }
  return t;
}

struct Row {
  double load;
  std::array<double, 5> at;  // t/tau for Ip/IB = 0, .5, .8, .9, 1
};

TEST(Thermal, ReachesTheLimitAtTheTimesOfIec60255) {
  // k = 1.05; computed from the equation above.
  constexpr std::array<double, 5> kBefore{0.0, 0.5, 0.8, 0.9, 1.0};
  constexpr std::array<Row, 6> kRows{{
      {1.1, {2.420885, 2.189442, 1.668146, 1.313974, .669617}},
      {1.2, {1.450833, 1.260143, .863046, .624154, .265209}},
      {1.5, {.673345, .555562, .338649, .227057, .085558}},
      {2.0, {.322446, .257908, .148093, .096173, .034764}},
      {3.0, {.130678, .102507, .056912, .036368, .012895}},
      {7.2, {.021497, .016663, .009074, .005748, .002018}},
  }};
  const double period_s = 0.01;
  for (const Row& row : kRows) {
    for (std::size_t i = 0; i < kBefore.size(); ++i) {
      const double expected = row.at[i] * kTau;
      EXPECT_NEAR(seconds_to_limit(row.load, kBefore[i], 1.05, period_s), expected,
                  period_s + 1e-3 * expected)
          << row.load << " after " << kBefore[i];
    }
  }
}

TEST(Thermal, ReachesTheLimitAtTheTimesOfIec60255ForOtherK) {
  EXPECT_NEAR(seconds_to_limit(1.2, 0.0, 1.0, 0.01), 1.185624 * kTau, 0.01 + 1e-3 * 1.185624 * kTau);
  EXPECT_NEAR(seconds_to_limit(5.0, 0.0, 1.0, 0.01), .040822 * kTau, 0.01 + 1e-3 * .040822 * kTau);
  EXPECT_NEAR(seconds_to_limit(1.5, 0.0, 1.1, 0.01), .771710 * kTau, 0.01 + 1e-3 * .771710 * kTau);
}

TEST(Thermal, NeverReachesTheLimitAtOrBelowTheRating) {
  EXPECT_GE(seconds_to_limit(1.05, 0.0, 1.05, 1.0), 10.0 * kTau);
  EXPECT_GE(seconds_to_limit(0.5, 0.0, 1.05, 1.0), 10.0 * kTau);
}

TEST(Thermal, TheTimeDoesNotDependOnTheStepLength) {
  // Load steps: 2 x rated for 60 s, nothing for 90 s, 1.4 x rated for 120 s; one exact exponential a segment.
  const auto run = [](double period_s) {
    ThermalModel model;
    const auto hold = [&](double torque, double seconds) {
      const auto steps = static_cast<int>(std::lround(seconds / period_s));
      for (int i = 0; i < steps; ++i) model.step(0, torque, kRated, kTau, period_s);
    };
    hold(20.0, 60.0);
    hold(0.0, 90.0);
    hold(14.0, 120.0);
    return model.theta(0);
  };
  double theta = 4.0 * (1.0 - std::exp(-60.0 / kTau));
  theta *= std::exp(-90.0 / kTau);
  theta = 1.96 + (theta - 1.96) * std::exp(-120.0 / kTau);
  for (const double period_s : {0.001, 0.01, 0.25, 30.0}) EXPECT_NEAR(run(period_s), theta, 1e-9) << period_s;
}

TEST(Thermal, CoolsByTheSameLaw) {
  // theta .9 -> .5 without load: tau ln(.9 / .5) = 352.672 s for tau = 600 s.
  ThermalModel model;
  PerJoint<Celsius> start;
  start[0] = 0.9;
  model.restore(start);
  double t = 0.0;
  while (model.theta(0) > 0.5) {
    model.step(0, 0.0, kRated, kTau, 0.01);
    t += 0.01;
  }
  EXPECT_NEAR(t, 352.672, 0.01 + 1e-3);
}

TEST(Thermal, NoTimeChangesNothing) {
  ThermalModel model;
  model.step(0, 20.0, kRated, kTau, 0.0);
  EXPECT_EQ(model.theta(0), 0.0);
}

TEST(Thermal, RisesBySixtyThreePerCentInOneTimeConstant) {
  constexpr std::array<double, 5> kRise{.632121, .864665, .950213, .981684, .993262};
  ThermalModel model;
  for (const double expected : kRise) {
    for (int i = 0; i < 6000; ++i) model.step(0, kRated, kRated, kTau, 0.1);
    EXPECT_NEAR(model.theta(0), expected, 1e-6);
  }
}

TEST(Thermal, StaysFiniteAndHotUnderAnyInput) {
  const double bad[] = {std::nan(""), std::numeric_limits<double>::infinity(), 1e308, -1e308, 0.0, -1.0};
  for (const double torque : {std::nan(""), std::numeric_limits<double>::infinity(), 1e308}) {
    ThermalModel model;
    for (int i = 0; i < 1000; ++i) model.step(0, torque, kRated, kTau, 0.1);
    EXPECT_TRUE(std::isfinite(model.theta(0)));
    EXPECT_GE(model.theta(0), 1.0);
  }
  for (const double rated : bad) {
    if (rated > 0.0 && std::isfinite(rated)) continue;
    ThermalModel model;
    model.step(0, 5.0, rated, kTau, 600.0);
    EXPECT_TRUE(std::isfinite(model.theta(0)));
    if (!(rated > 0.0)) {
      EXPECT_GE(model.theta(0), 1.0) << rated;
    }
  }
  for (const double tau : {std::nan(""), 0.0, -1.0, -std::numeric_limits<double>::infinity()}) {
    ThermalModel model;
    model.step(0, 20.0, kRated, tau, 0.001);
    EXPECT_EQ(model.theta(0), 4.0) << tau;
  }
}

TEST(Thermal, ARestoredStateThatIsNotKnownCountsAsHot) {
  PerJoint<Celsius> state;
  state[0] = 0.4;
  state[1] = std::nan("");
  state[2] = -0.1;
  state[3] = std::numeric_limits<double>::infinity();
  ThermalModel model;
  model.restore(state);
  EXPECT_EQ(model.theta(0), 0.4);
  for (int j = 1; j < 4; ++j) EXPECT_EQ(model.theta(j), 1.0) << j;
  EXPECT_EQ(model.worst(4), 1.0);
  EXPECT_EQ(model.worst(1), 0.4);
}

}  // namespace
}  // namespace pastern::safety
