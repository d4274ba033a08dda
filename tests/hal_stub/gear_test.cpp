// Gears that lose torque and stick, drives and packs that limit: closed forms beside the checks.
#include <gtest/gtest.h>

#include <cmath>

#include "hal_stub/drives/drive.h"

namespace pastern::stub {
namespace {

constexpr double kStep = 1e-3;  // s, that of the robots

/// A rotor with its joint on a rigid gear, stepped as the robot steps them.
struct Geared {
  GearFriction<double> gear{};
  double loss{0};
  double inertia{0.02};
  double angle{0};
  double speed{0};
  double wound{0};

  void step(double torque, double load) {
    GearFriction<double> now = gear;
    now.sliding += loss * std::fabs(torque);
    const GearGrip<double> grip = gear_grip(now, speed, wound, kStep);
    speed +=
        kStep * (torque + load - grip.push - grip.viscosity * speed) / (inertia + kStep * grip.viscosity);
    angle += speed * kStep;
    wound = wound_after(wound, speed, kStep);
  }
};

// A gear that loses the part p of the drive's torque T: raising the load L takes T (1 - p) = L, letting it
// down T (1 + p) = L.
TEST(Gear, LossIsAgainstTheMotionWhicheverWayTheTorqueGoes) {
  for (const double p : {0.06, 0.12}) {
    for (const double way : {1.0, -1.0}) {
      Geared g;
      g.loss = p;
      g.speed = way;
      double torque = 10;
      for (int k = 0; k < 4000; ++k) {
        torque += 0.5 * (way - g.speed);  // speed held by the integral of its error
        g.step(torque + 2 * (way - g.speed), -10);
      }
      EXPECT_NEAR(torque, 10 / (1 - way * p), 1e-6);
    }
  }
}

TEST(Gear, WithoutLossAndStickItIsPlainGearFriction) {
  const GearGrip<double> grip = gear_grip(GearFriction<double>{0.1, 0.3, 0}, 2.0, 0.4, kStep);
  EXPECT_EQ(grip.push, 0);
  EXPECT_EQ(grip.viscosity, gear_viscosity(0.1, 0.3, 2.0));
}

TEST(Gear, HoldsBelowItsBreakawayWithoutCreeping) {
  Geared g;
  g.gear = {0.05, 0.4, 0.3};
  for (int k = 0; k < 1000; ++k) g.step(0.95 * 0.7, 0);
  const double held = g.angle;
  EXPECT_NEAR(held, 0.95 * kStickAngle, 1e-6);  // the spring's static answer
  for (int k = 0; k < 60000; ++k) g.step(0.95 * 0.7, 0);
  EXPECT_NEAR(g.angle, held, 1e-9);
  for (int k = 0; k < 1000; ++k) g.step(0, 0);
  EXPECT_NEAR(g.angle, 0, 1e-6);  // it was drawn, not moved
}

TEST(Gear, BreaksAwayAboveAndThenSlidesByCoulomb) {
  Geared g;
  g.gear = {0, 0.4, 0.3};
  for (int k = 0; k < 200; ++k) g.step(1.05 * 0.7, 0);
  EXPECT_GT(g.speed, 0.5);
  const double before = g.speed;
  for (int k = 0; k < 1000; ++k) g.step(1.05 * 0.7, 0);
  // (T - Fc) / J but for what is left of the excess at that speed.
  EXPECT_NEAR(g.speed - before, (1.05 * 0.7 - 0.4) / 0.02, 0.05);
}

// J w^2 / 2 = F s.
TEST(Gear, SlidesAsFarAsItsFrictionAllowsAndRests) {
  for (const double way : {1.0, -1.0}) {
    Geared g;
    g.gear = {0, 0.5, 0.1};
    g.speed = 8 * way;
    for (int k = 0; k < 2000; ++k) g.step(0, 0);
    EXPECT_NEAR(g.angle * way, 0.02 * 64 / 2 / 0.5, 0.02);
    EXPECT_NEAR(g.speed, 0, 1e-9);
  }
}

TEST(Gear, AStickingGearIsCalmAtAMillisecondHoweverLightTheRotor) {
  for (const double inertia : {1e-5, 1e-3, 0.02}) {
    Geared g;
    g.gear = {0.02, 2, 3};
    g.inertia = inertia;
    for (int k = 0; k < 3000; ++k) {
      g.step(3 * std::sin(0.02 * k), 0);
      EXPECT_LT(std::fabs(g.angle), 1.01 * kStickAngle);
    }
  }
}

TEST(Limits, TorqueFallsLinearlyFromTheWarmToTheHotWinding) {
  DriveFigures<double> d;
  d.most_torque = 28;
  d.hot = 130;
  d.per_derating = 1.0 / 40;
  EXPECT_EQ(let_through(d, 20.0), 28);
  EXPECT_NEAR(let_through(d, 90.0), 28, 1e-12);
  EXPECT_NEAR(let_through(d, 100.0), 21, 1e-12);
  EXPECT_NEAR(let_through(d, 120.0), 7, 1e-12);
  EXPECT_EQ(let_through(d, 131.0), 0);
  DriveFigures<double> free;
  free.most_torque = 30;
  EXPECT_EQ(let_through(free, 200.0), 30);
}

// Source: V = E - I R: 50.4 V, 0.1 ohm, 1000 W wanted: 20.69 A. At a limit of 15 A the pack gives
// 15 (50.4 - 1.5) = 733.5 W.
TEST(Limits, DrivesAreHeldBackUntilThePacksCurrentIsWithinItsLimit) {
  PackFigures<double> pack{48, 9 * 3600, 0.1, 0};
  pack.most_current = 15;
  const PackSite<double> site{50.4 / open_voltage(0.6), 0.1};
  PackState<double> state{0.6, 50.4, 0};
  const auto run = [&](double wanted, int steps) {
    for (int k = 0; k < steps; ++k) {
      state.charge = 0.6;
      draw(pack, site, wanted * state.share, kStep, state);
      hold_back(pack, kStep, state);
    }
  };
  run(1000, 30);
  EXPECT_LT(state.current, 15.2);  // within a few of its time constants
  run(1000, 1000);
  EXPECT_NEAR(state.current, 15, 1e-6);
  EXPECT_NEAR(state.share, 0.7335, 1e-4);
  run(100, 200);
  EXPECT_NEAR(state.share, 1, 1e-9);
}

TEST(Pack, ResistanceRisesInTheColdByTheRatioOfItsFile) {
  EXPECT_NEAR(cold_resistance(4, -20), 4, 1e-12);
  EXPECT_NEAR(cold_resistance(4, 2.5), 2, 1e-12);
  EXPECT_EQ(cold_resistance(4, 25), 1);
  EXPECT_EQ(cold_resistance(4, 40), 1);
  EXPECT_EQ(cold_resistance(1, -40), 1);
}

// Source: Chen and Rincon-Mora, IEEE Trans. Energy Conv. 21(2) 2006, V(s) of an 850 mAh cell, computed from
// the published polynomial. The knee is a rational function here: off by up to 33 mV below 15 % of charge,
// where no site begins.
TEST(Pack, OpenVoltageFollowsThePublishedCurveOverAllOfTheCharge) {
  const double table[][3] = {{0, 2.6540, 0.001},    {0.05, 3.5164, 0.034}, {0.1, 3.6746, 0.026},
                             {0.2, 3.7250, 0.007},  {0.3, 3.7477, 0.002},  {0.4, 3.7729, 0.0005},
                             {0.5, 3.8034, 0.0005}, {0.6, 3.8411, 0.0005}, {0.7, 3.8880, 0.0005},
                             {0.8, 3.9460, 0.0005}, {0.9, 4.0170, 0.0005}, {1, 4.1029, 0.0005}};
  for (const auto& row : table) EXPECT_NEAR(open_voltage(row[0]) * 3.8411, row[1], row[2]) << row[0];
}

}  // namespace
}  // namespace pastern::stub
