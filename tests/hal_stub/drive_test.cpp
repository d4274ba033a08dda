// Drives and pack: torque-speed line, heat, play, supply. Sources stand beside the checks.
#include "hal_stub/drives/drive.h"

#include <gtest/gtest.h>

#include <cmath>

namespace pastern::stub {
namespace {

DriveFigures<double> drive() {
  DriveFigures<double> d;
  d.peak_torque = 30;
  d.no_load_speed = 20;
  d.rotor_inertia = 0.02;
  d.per_amp = 2;
  d.resistance = 0.5;
  return d;
}

TEST(Drive, MakesThePeakAtRestAndNothingAtNoLoadSpeed) {
  const auto d = drive();
  EXPECT_NEAR(made_torque(d, 100.0, 0.0, 1.0, 25.0), 30, 1e-9);
  EXPECT_NEAR(made_torque(d, -100.0, 0.0, 1.0, 25.0), -30, 1e-9);
  EXPECT_NEAR(made_torque(d, 100.0, 10.0, 1.0, 25.0), 15, 1e-9);
  EXPECT_NEAR(made_torque(d, 100.0, 20.0, 1.0, 25.0), 0, 1e-9);
  EXPECT_NEAR(made_torque(d, 100.0, 25.0, 1.0, 25.0), 0, 1e-9);
  EXPECT_NEAR(made_torque(d, 4.0, 10.0, 1.0, 25.0), 4, 1e-12);
}

TEST(Drive, BrakesWithUpToThePeakAtAnySpeed) {
  EXPECT_NEAR(made_torque(drive(), -100.0, 15.0, 1.0, 25.0), -30, 1e-9);
  EXPECT_NEAR(made_torque(drive(), 100.0, -15.0, 1.0, 25.0), 30, 1e-9);
}

TEST(Drive, LineMovesWithTheSupplyAndANullSupplyMakesNothingAtRest) {
  EXPECT_NEAR(made_torque(drive(), 100.0, 0.0, 0.7, 25.0), 21, 1e-9);
  EXPECT_NEAR(made_torque(drive(), 100.0, 14.0, 0.7, 25.0), 0, 1e-9);
  EXPECT_EQ(made_torque(drive(), 100.0, 0.0, 0.0, 25.0), 0);
}

// Source: copper 1 + 0.00393 (T - 20): 100 deg C 1.3144, -20 deg C 0.8428 (handbook).
TEST(Drive, CopperRisesWithTemperatureAndAHotDriveIsWeaker) {
  EXPECT_NEAR(copper_ratio(100.0) / copper_ratio(20.0), 1.3144, 1e-4);
  EXPECT_NEAR(copper_ratio(-20.0) / copper_ratio(20.0), 0.8428, 1e-4);
  EXPECT_NEAR(copper_ratio(25.0), 1, 1e-5);
  EXPECT_LT(made_torque(drive(), 100.0, 0.0, 1.0, 100.0), 30 / 1.28);
}

// Source: exponential of the 2x2 system C1 = 20, R12 = 1, C2 = 500, R2a = 2, 10 W from ambient: K at 10, 60,
// 600 s.
TEST(Drive, WindingAndHousingWarmAsTheTwoNodeModelSays) {
  DriveFigures<double> d = drive();
  d.winding_per_j = 1.0 / 20;
  d.housing_per_j = 1.0 / 500;
  d.to_housing = 1;
  d.to_air = 0.5;
  double winding = 0;
  double housing = 0;
  const double dt = 1e-3;
  const double expected[3][3] = {
      {10, 3.9411761818, 0.0422062557}, {60, 9.9819993327, 0.7818093905}, {600, 18.3269495714, 8.5512622753}};
  long k = 0;
  for (const auto& row : expected) {
    for (; k < std::lround(row[0] / dt); ++k) heat(d, 10.0, 0.0, dt, winding, housing);
    EXPECT_NEAR(winding, row[1], 1e-3);
    EXPECT_NEAR(housing, row[2], 1e-3);
  }
}

// Source: J w' = -b w - c stops after (J/b) ln(1 + b w0/c): w0 = 10, J = .01, b = .02, c = .05: 0.80471896 s,
// having turned 2.98820261 rad.
TEST(Drive, GearFrictionStopsAJointAsViscousAndCoulombFrictionDo) {
  double speed = 10;
  double angle = 0;
  double time = 0;
  const double dt = 1e-6;
  while (speed > kCoulombSpeed && time < 2) {
    const double viscosity = gear_viscosity(0.02, 0.05, speed);
    speed = 0.01 * speed / (0.01 + dt * viscosity);
    angle += speed * dt;
    time += dt;
  }
  const double rest = 0.01 * kCoulombSpeed / 0.05;  // the regularised end is left out
  EXPECT_NEAR(time + rest, 0.80471896, 2e-4);
  EXPECT_NEAR(angle, 2.98820261, 3e-4);
}

/// Rotor and a joint of 0.05 kg m2 with a gap, stepped as the robot steps them.
struct Geared {
  double half_gap;
  double angle{0};
  double speed{0};
  double rotor_angle{0};
  double rotor_speed{0};

  void step(double torque, double load_torque, double dt) {
    Coupling<double> c{};
    const GearedJoint<double> geared{torque, 0.1, half_gap, angle, speed, rotor_angle, rotor_speed};
    const auto load = load_of(drive(), Teeth<double>{}, geared, dt, c);
    const double a = (load.torque + load_torque) / (0.05 + load.inertia);
    speed += a * dt;
    angle += speed * dt;
    if (half_gap > 0) {
      rotor_speed += (c.rotor_force * dt + c.mesh * a * dt) * c.rotor_inverse;
      rotor_angle += rotor_speed * dt;
    } else {
      rotor_speed = speed;
      rotor_angle = angle;
    }
  }
};

TEST(Drive, WithoutPlayTheRotorIsPartOfTheJoint) {
  Geared g{0};
  g.step(7, 0, 1e-3);
  EXPECT_NEAR(g.speed, 7e-3 / (0.05 + 0.02 + 1e-4), 1e-12);
}

TEST(Drive, PlayLetsTheJointMoveByTheGapBeforeTheTeethMeet) {
  Geared g{0.01};
  for (int k = 0; k < 3000; ++k) g.step(1, 0, 1e-3);  // driven: the rotor leads by half a gap
  EXPECT_NEAR(g.rotor_angle - g.angle, 0.01, 1e-3);
  EXPECT_NEAR(g.rotor_speed, g.speed, 1e-3);
  g.rotor_speed = g.speed = 0;
  const double before = g.angle;
  for (int k = 0; k < 5; ++k) g.step(-1, 0, 1e-3);  // reversed: the gap opens, the joint does not feel it yet
  EXPECT_LT(g.rotor_angle - g.angle, 0.01);
  EXPECT_NEAR(g.angle, before, 1e-3);
  for (int k = 0; k < 3000; ++k) g.step(-1, 0, 1e-3);
  EXPECT_NEAR(g.rotor_angle - g.angle, -0.01, 1e-3);
}

TEST(Drive, AJointWithPlayRestsOnItsTeethUnderALoad) {
  Geared g{0.01};
  for (int k = 0; k < 8000; ++k) g.step(30 * (0.05 - g.rotor_angle) - 2 * g.rotor_speed, -1, 1e-3);
  EXPECT_NEAR(g.rotor_angle, 0.05 - 1.0 / 30, 1e-6);
  EXPECT_NEAR(g.rotor_angle - g.angle, 0.01 + 1 / Teeth<double>{}.stiffness, 1e-6);
  EXPECT_NEAR(g.speed, 0, 1e-6);
}

PackFigures<double> pack() { return {48, 9 * 3600, 0.1, 20}; }

// Source: I = (E - sqrt(E^2 - 4 R P)) / 2 R: E 50.4 V, R 0.1 ohm, 1000 W: 20.6906833 A, 48.3309317 V.
TEST(Pack, SagsUnderConstantPower) {
  PackState<double> state{0.6, 0, 0};
  const PackSite<double> site{50.4 / open_voltage(0.6), 0.1};
  draw(pack(), site, 1000.0, 1e-3, state);
  EXPECT_NEAR(state.current, 20.6906833, 1e-6);
  EXPECT_NEAR(state.voltage, 48.3309317, 1e-6);
}

// Source: most power E^2 / 4 R = 6350.4 W; more than that must not become NaN.
TEST(Pack, GivesNoMoreThanItsMostPower) {
  PackState<double> state{0.6, 0, 0};
  const PackSite<double> site{50.4 / open_voltage(0.6), 0.1};
  draw(pack(), site, 1e5, 1e-3, state);
  EXPECT_NEAR(state.current * state.voltage, 6350.4, 1e-6);
}

TEST(Pack, ChargeRunsDownWithTheCurrentAndVoltageFallsWithTheCharge) {
  PackState<double> state{0.6, 0, 0};
  const PackSite<double> site{50.4, 0.1};
  double used = 0;
  for (int k = 0; k < 1000; ++k) {
    draw(pack(), site, 500.0, 1.0, state);
    used += state.current;
  }
  EXPECT_NEAR(state.charge, 0.6 - used / (9 * 3600), 1e-12);
  EXPECT_LT(open_voltage(state.charge), open_voltage(0.6));
}

// Source: Chen and Rincon-Mora 2006: 0.2 3.7250, 0.4 3.7729, 0.8 3.9460, 1 4.1029 V; relative to 0.6, 3.8411
// V.
TEST(Pack, CellVoltageFollowsThePublishedCurve) {
  EXPECT_NEAR(open_voltage(0.4) * 3.8411, 3.7729, 0.002);
  EXPECT_NEAR(open_voltage(0.6) * 3.8411, 3.8411, 0.002);
  EXPECT_NEAR(open_voltage(0.8) * 3.8411, 3.9460, 0.002);
  EXPECT_NEAR(open_voltage(1.0) * 3.8411, 4.1029, 0.002);
  EXPECT_NEAR(open_voltage(0.2) * 3.8411, 3.7250, 0.02);  // the exponential knee is a rational function here
  double before = 0;
  for (int i = 0; i <= 100; ++i) {
    EXPECT_GT(open_voltage(i / 100.0), before);
    before = open_voltage(i / 100.0);
  }
}

}  // namespace
}  // namespace pastern::stub
