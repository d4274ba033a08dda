// Attitude filter and angles against SciPy's rotations (z-y-x sequence, scalar first) and the linear theory
// of the explicit complementary filter (Mahony, Hamel, Pflimlin, IEEE TAC 53(5) 2008; constants derived).
#include "runtime/estimate/attitude.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <limits>

namespace pastern::estimate {
namespace {

constexpr double kDegree = M_PI / 180;
constexpr double kG = 9.80665;

Eigen::Vector3d gravity_felt(const Eigen::Quaterniond& attitude) {
  return attitude.conjugate() * Eigen::Vector3d(0, 0, kG);
}

double tilt_error(const AttitudeFilter& filter, const Eigen::Quaterniond& truth) {
  const Eigen::Vector3d seen = filter.attitude().conjugate() * Eigen::Vector3d::UnitZ();
  const Eigen::Vector3d real = truth.conjugate() * Eigen::Vector3d::UnitZ();
  return std::atan2(seen.cross(real).norm(), seen.dot(real));
}

/// Distance of two attitudes, the sign of the quaternion being free.
double apart(const Eigen::Quaterniond& a, const Eigen::Quaterniond& b) {
  return std::min((a.coeffs() - b.coeffs()).norm(), (a.coeffs() + b.coeffs()).norm());
}

struct Row {
  double yaw, pitch, roll, w, x, y, z;
};
constexpr std::array<Row, 9> kRows{
    {{30, 20, 10, .951548524644, .038134576475, .189307857412, .239298337745},
     {90, 0, 0, .707106781187, 0, 0, .707106781187},
     {0, 90, 0, .707106781187, 0, .707106781187, 0},
     {0, 0, 90, .707106781187, .707106781187, 0, 0},
     {-120, 45, 170, .289891741897, -.489066542183, .780381981774, .260347187079},
     {10, -89.9, 20, .68362716069, .183066413139, -.68239772295, .182958851274},
     {45, 60, -30, .723317411365, -.391903837329, .36042340565, .439679739541},
     {180, 0, 0, 0, 0, 0, 1},
     {0, 0, 180, 0, 1, 0, 0}}};

TEST(Angles, QuaternionsOfTheReferenceTable) {
  for (const Row& row : kRows) {
    const Eigen::Quaterniond q = attitude_of({row.roll * kDegree, row.pitch * kDegree, row.yaw * kDegree});
    EXPECT_LT(apart(q, Eigen::Quaterniond(row.w, row.x, row.y, row.z)), 1e-10) << row.yaw << " " << row.pitch;
  }
}

TEST(Angles, BackFromTheReferenceTable) {
  for (const Row& row : kRows) {
    for (const double sign : {1.0, -1.0}) {
      const Angles angles =
          angles_of(Eigen::Quaterniond(sign * row.w, sign * row.x, sign * row.y, sign * row.z));
      // The table has 12 digits; near the pole yaw and roll amplify them by 1/cos(pitch).
      const double tolerance = 1e-11 / std::max(std::cos(row.pitch * kDegree), 1e-3) + 1e-10;
      if (std::abs(row.pitch) < 90) {
        EXPECT_NEAR(std::remainder(angles.yaw_rad - row.yaw * kDegree, 2 * M_PI), 0, tolerance);
        EXPECT_NEAR(std::remainder(angles.roll_rad - row.roll * kDegree, 2 * M_PI), 0, tolerance);
      }
      EXPECT_NEAR(angles.pitch_rad, row.pitch * kDegree, 1e-8);
    }
  }
}

TEST(Angles, AtThePolesFiniteAndTheSameAttitude) {
  // Pitch +90: only yaw - roll can be seen, (40, 90, 10) == (30, 90, 0); pitch -90: yaw + roll, (40, -90, 10)
  // == (50, -90, 0).
  EXPECT_LT(apart(attitude_of({10 * kDegree, 90 * kDegree, 40 * kDegree}),
                  attitude_of({0, 90 * kDegree, 30 * kDegree})),
            1e-10);
  EXPECT_LT(apart(attitude_of({10 * kDegree, -90 * kDegree, 40 * kDegree}),
                  attitude_of({0, -90 * kDegree, 50 * kDegree})),
            1e-10);
  for (const double pitch : {90.0, -90.0, 90 - 1e-7, -90 + 1e-7, 90 - 1e-6, 89.9999}) {
    for (const double yaw : {-170.0, 40.0, 0.0}) {
      for (const double roll : {10.0, -130.0}) {
        Eigen::Quaterniond q = attitude_of({roll * kDegree, pitch * kDegree, yaw * kDegree});
        for (const double stretch : {1.0, 1.0 + 1e-16, 1.0 + 1e-9}) {  // |sine| a little over one
          const Angles angles = angles_of(Eigen::Quaterniond(q.coeffs() * stretch));
          ASSERT_TRUE(std::isfinite(angles.roll_rad + angles.pitch_rad + angles.yaw_rad));
          EXPECT_LT(apart(attitude_of(angles), q), 1e-7) << pitch << " " << yaw << " " << roll;
        }
      }
    }
  }
}

TEST(Attitude, AccelerometerAtRestGivesRollAndPitch) {
  // (30, 20, 10): the accelerometer reads (-3.354071839, 1.600209049, 9.075236489) for any yaw.
  AttitudeFilter filter;
  filter.begin({-3.354071839, 1.600209049, 9.075236489});
  const Angles angles = angles_of(filter.attitude());
  EXPECT_NEAR(angles.roll_rad, 10 * kDegree, 1e-9);
  EXPECT_NEAR(angles.pitch_rad, 20 * kDegree, 1e-9);
  EXPECT_NEAR(angles.yaw_rad, 0, 1e-12);
  filter.begin({0, 0, -kG});  // upside down
  EXPECT_NEAR(std::abs(angles_of(filter.attitude()).roll_rad), M_PI, 1e-12);
  const double nan = std::numeric_limits<double>::quiet_NaN();
  for (const Eigen::Vector3d& nothing : {Eigen::Vector3d(0, 0, 0), Eigen::Vector3d(nan, 0, kG)}) {
    filter.begin(nothing);
    EXPECT_LT(apart(filter.attitude(), Eigen::Quaterniond::Identity()), 1e-15);
  }
}

TEST(Attitude, ConstantRateIsIntegratedExactly) {
  // Body rate (1, 2, 3) rad/s for 1 s -> (-.295551127493, .255321860045, .510643720091, .765965580136).
  const Eigen::Quaterniond expected(-.295551127493, .255321860045, .510643720091, .765965580136);
  for (const int steps : {1, 7, 1000}) {
    AttitudeFilter filter(AttitudeGains{0, 0, 0, 0, 0});
    for (int i = 0; i < steps; ++i) {
      filter.update({1, 2, 3}, {0, 0, kG}, 1.0 / steps, false);
    }
    EXPECT_LT(apart(filter.attitude(), expected), 1e-11) << steps;
  }
}

TEST(Attitude, RotationVectorOfTheReference) {
  // exp(.1, .2, .3) -> (.982550982155, .049708843325, .099417686650, .149126529975).
  AttitudeFilter filter(AttitudeGains{0, 0, 0, 0, 0});
  filter.update({.1, .2, .3}, {0, 0, kG}, 1.0, false);
  EXPECT_LT(apart(filter.attitude(), {.982550982155, .049708843325, .099417686650, .149126529975}), 1e-11);
}

TEST(Attitude, RatesOfTheAnglesUnderABodyRate) {
  // w = (.1, .2, .3), roll 10, pitch 20: roll' .220172766, pitch' .144867097, yaw' .351361662.
  AttitudeFilter filter(AttitudeGains{0, 0, 0, 0, 0});
  filter.adopt(attitude_of({10 * kDegree, 20 * kDegree, 0}));
  const Angles before = angles_of(filter.attitude());
  const double h = 1e-6;
  filter.update({.1, .2, .3}, {0, 0, kG}, h, false);
  const Angles after = angles_of(filter.attitude());
  EXPECT_NEAR((after.roll_rad - before.roll_rad) / h, .220172766, 1e-6);
  EXPECT_NEAR((after.pitch_rad - before.pitch_rad) / h, .144867097, 1e-6);
  EXPECT_NEAR((after.yaw_rad - before.yaw_rad) / h, .351361662, 1e-6);
}

TEST(Attitude, WithoutIntegralABiasLeavesBiasOverGain) {
  // ki = 0, bias .02 rad/s, kp = 1: 1.1459 degrees remain.
  AttitudeFilter filter(AttitudeGains{1, 0, 1, 0, 0});
  for (int i = 0; i < 20000; ++i) {
    filter.update({.02, 0, 0}, {0, 0, kG}, 1e-3, false);
  }
  // Beyond the linear theory: sin of the error, 7e-5 of it.
  EXPECT_NEAR(tilt_error(filter, Eigen::Quaterniond::Identity()) / kDegree, 1.1459, 2e-4);
}

TEST(Attitude, TimeConstantIsOneOverGain) {
  AttitudeFilter filter(AttitudeGains{2, 0, 2, 0, 0});
  filter.adopt(attitude_of({0.01, 0, 0}));
  for (int i = 0; i < 500; ++i) {
    filter.update({0, 0, 0}, {0, 0, kG}, 1e-3, false);
  }
  EXPECT_NEAR(tilt_error(filter, Eigen::Quaterniond::Identity()), 0.01 * std::exp(-1), 5e-6);
}

TEST(Attitude, WithIntegralErrorVanishesAndTheBiasIsFound) {
  // s^2 + kp s + ki with kp = 1, ki = .25: critically damped at .5 /s; after 60 s e^-30 (1 + 30) is left.
  AttitudeFilter filter(AttitudeGains{1, .25, 1, .25, 0});
  const Eigen::Quaterniond truth = attitude_of({0.2, -0.1, 0});
  filter.begin(gravity_felt(truth));
  for (int i = 0; i < 60000; ++i) {
    filter.update({.02, -.01, 0}, gravity_felt(truth), 1e-3, false);
  }
  EXPECT_LT(tilt_error(filter, truth), 1e-9);
  // Along gravity no bias can be seen: compare what is across it.
  const Eigen::Vector3d down = gravity_felt(truth) / kG;
  const Eigen::Vector3d wrong = filter.bias_rad_s() - Eigen::Vector3d(.02, -.01, 0);
  EXPECT_LT((wrong - down * wrong.dot(down)).norm(), 1e-9);
}

TEST(Attitude, FromAlmostUpsideDownItComesBack) {
  // The equilibrium at 180 degrees is unstable: from 179 it must converge.
  AttitudeFilter filter(AttitudeGains{1, .05, 1, .05, 0});
  filter.adopt(attitude_of({179 * kDegree, 0, 0}));
  for (int i = 0; i < 200000; ++i) {
    filter.update({0, 0, 0}, {0, 0, kG}, 1e-3, false);
  }
  EXPECT_LT(tilt_error(filter, Eigen::Quaterniond::Identity()), 1e-3);
}

TEST(Attitude, YawDriftsByBiasTimesTimeWhileMovingAndNotAtRest) {
  AttitudeFilter moving;
  AttitudeFilter still;
  for (int i = 0; i < 60000; ++i) {
    moving.update({0, 0, .004}, {0, 0, kG}, 1e-3, false);
    still.update({0, 0, .004}, {0, 0, kG}, 1e-3, true);
  }
  EXPECT_NEAR(angles_of(moving.attitude()).yaw_rad, .004 * 60, 1e-9);
  // At rest the bias is learned with 2 /s: what was turned before is bias / 2.
  EXPECT_NEAR(angles_of(still.attitude()).yaw_rad, .004 / 2, 1e-5);
  EXPECT_NEAR(still.bias_rad_s().z(), .004, 1e-9);
}

TEST(Attitude, AWalkingTrunksAccelerationsCancelOverTheGait) {
  // 5 Hz, 4 m/s^2 forward and 6 m/s^2 up in quadrature and in phase: the mean force is gravity.
  for (const double phase : {0.0, M_PI / 2}) {
    AttitudeFilter filter;
    double pitch_sum = 0;
    for (int i = 0; i < 40000; ++i) {
      const double turn = 2 * M_PI * 5 * i * 1e-3;
      filter.update({0, 0, 0}, {4 * std::sin(turn), 0, kG + 6 * std::sin(turn + phase)}, 1e-3, false);
      pitch_sum += angles_of(filter.attitude()).pitch_rad;
    }
    EXPECT_LT(std::abs(pitch_sum / 40000), 2e-3);
  }
}

TEST(Attitude, ABlowDoesNotTurnTheFilter) {
  AttitudeFilter filter;
  filter.update({0, 0, 0}, {1e6, 0, 0}, 1e-3, false);
  EXPECT_LT(tilt_error(filter, Eigen::Quaterniond::Identity()), 1e-3) << "two g at most, one tick, kp 0.4";
}

}  // namespace
}  // namespace pastern::estimate
