// The gate's tilt filter against closed forms. Angles: aerospace z-y-x sequence.
#include "safety/tilt.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace pastern::safety {
namespace {

using Rate = Vector3<RadianPerSecond, Body>;
using Acceleration = Vector3<MetrePerSecondSquared, Body>;
constexpr double kDegree = 0.017453292519943295;

TiltFilter after(const Acceleration& first) {
  TiltFilter filter;
  filter.follow({}, first, 0.001, 1.0);
  return filter;
}

Acceleration at_rest(double roll, double pitch) {
  return {-kGravity * std::sin(pitch), kGravity * std::cos(pitch) * std::sin(roll),
          kGravity * std::cos(pitch) * std::cos(roll)};
}

TEST(Tilt, AccelerometerAtRestGivesRollAndPitch) {
  // yaw, pitch, roll = 30, 20, 10 degrees: accelerometer (-3.354071839, 1.600209049, 9.075236489) m/s^2,
  // tilt 22.268744 degrees. Computed with SciPy 1.10.1 Rotation('ZYX').
  const TiltFilter filter = after({-3.354071839, 1.600209049, 9.075236489});
  EXPECT_NEAR(filter.roll() / kDegree, 10.0, 1e-7);
  EXPECT_NEAR(filter.pitch() / kDegree, 20.0, 1e-7);
  EXPECT_NEAR(std::acos(filter.up().z) / kDegree, 22.268744, 1e-6);
}

TEST(Tilt, StaysFiniteOnItsSideOnItsHeadAndNoseUp) {
  EXPECT_NEAR(after({0.0, kGravity, 0.0}).roll(), 90.0 * kDegree, 1e-12);
  EXPECT_NEAR(std::fabs(after({0.0, 0.0, -kGravity}).roll()), 180.0 * kDegree, 1e-12);
  const TiltFilter nose_up = after({-kGravity, 0.0, 0.0});
  EXPECT_NEAR(nose_up.pitch(), 90.0 * kDegree, 1e-12);
  EXPECT_TRUE(std::isfinite(nose_up.roll()));
}

TEST(Tilt, GyroAloneFollowsAConstantBodyRateExactly) {
  // Rotation by (1, 2, 3) rad/s for 1 s: q = (-.295551127493, .255321860045, .510643720091, .765965580136)
  // (SciPy 1.10.1); the third row of its matrix is the direction of up in the body. Free fall keeps the
  // accelerometer out.
  TiltFilter filter = after({0.0, 0.0, kGravity});
  for (int i = 0; i < 1000; ++i) filter.follow(Rate{1.0, 2.0, 3.0}, Acceleration{}, 0.001, 0.5);
  const double w = -.295551127493;
  const double x = .255321860045;
  const double y = .510643720091;
  const double z = .765965580136;
  EXPECT_NEAR(filter.up().x, 2.0 * (x * z - w * y), 1e-9);
  EXPECT_NEAR(filter.up().y, 2.0 * (y * z + w * x), 1e-9);
  EXPECT_NEAR(filter.up().z, 1.0 - 2.0 * (x * x + y * y), 1e-9);
}

TEST(Tilt, AGyroBiasLeavesTheErrorOfTheComplementaryFilter) {
  // First-order complementary filter: a bias b leaves b * tau (in small angles; linearised as for the passive
  // filter with gain 1/tau). b = 0.02 rad/s, tau = 1 s: 1.1459 degrees.
  TiltFilter filter = after({0.0, 0.0, kGravity});
  for (int i = 0; i < 20'000; ++i) filter.follow(Rate{0.02, 0.0, 0.0}, at_rest(0.0, 0.0), 0.001, 1.0);
  EXPECT_NEAR(filter.roll() / kDegree, 1.1459, 0.002);
}

TEST(Tilt, ConvergesWithItsTimeConstant) {
  // Small angles: the error falls as exp(-t / tau).
  TiltFilter filter;
  for (int i = 0; i < 60; ++i) filter.follow({}, at_rest(0.1, 0.0), 0.001, 0.5);  // the first direction
  for (int i = 0; i < 500; ++i) filter.follow({}, at_rest(0.0, 0.0), 0.001, 0.5);
  EXPECT_NEAR(filter.roll(), 0.1 * std::exp(-1.0), 2e-4);
}

TEST(Tilt, AccelerationsThatCannotBeGravityAloneAreLeftOut) {
  for (const double size : {0.49, 1.51, 0.0, 15.0}) {
    TiltFilter filter = after({0.0, 0.0, kGravity});
    for (int i = 0; i < 1000; ++i) filter.follow({}, Acceleration{0.0, size * kGravity, 0.0}, 0.001, 0.5);
    EXPECT_EQ(filter.roll(), 0.0) << size;
  }
  TiltFilter filter = after({0.0, 0.0, kGravity});
  for (int i = 0; i < 1000; ++i) filter.follow({}, Acceleration{0.0, 0.51 * kGravity, 0.0}, 0.001, 0.5);
  EXPECT_GT(filter.roll(), 0.5);
}

TEST(Tilt, NotFiniteAndHugeSamplesChangeNothing) {
  TiltFilter filter = after(at_rest(0.2, -0.3));
  const double roll = filter.roll();
  const double pitch = filter.pitch();
  for (const double bad : {std::nan(""), std::numeric_limits<double>::infinity(), 1e308}) {
    filter.follow(Rate{bad, 0.0, 0.0}, Acceleration{bad, 0.0, 0.0}, 0.001, 0.5);
    filter.follow(Rate{0.0, bad, bad}, Acceleration{0.0, 0.0, bad}, 0.001, 0.5);
  }
  filter.follow({}, at_rest(1.0, 1.0), std::nan(""), 0.5);
  EXPECT_EQ(filter.roll(), roll);
  EXPECT_EQ(filter.pitch(), pitch);
}

// A robot that has just been put down: the last millimetres in free fall, a landing, then rest.
TEST(Tilt, AFirstSampleInFreeFallIsForgottenWhenGravityIsFelt) {
  for (const double x : {-0.96, -3.41}) {  // seen on a simulated robot laid down: 0.1 g and 0.7 g, askew
    TiltFilter filter;
    filter.follow({}, Acceleration{x, -0.16, x < -2 ? 5.66 : 0.59}, 0.001, 0.5);
    EXPECT_GT(std::fabs(filter.pitch()), 0.5);
    for (int i = 0; i < 20; ++i) filter.follow({}, Acceleration{0.0, 0.1, 0.5}, 0.001, 0.5);
    for (int i = 0; i < 5; ++i) filter.follow({}, Acceleration{3.0, 0.0, 30.0}, 0.001, 0.5);
    for (int i = 0; i < 60; ++i) filter.follow({}, at_rest(0.02, 0.01), 0.001, 0.5);
    EXPECT_NEAR(filter.roll(), 0.02, 0.02);
    EXPECT_NEAR(filter.pitch(), 0.01, 0.02);
  }
}

// One sample of the mean is worth its share, not more: noise of a first sample does not stay.
TEST(Tilt, ATimeConstantThatIsNotANumberLeavesTheFirstDirection) {
  TiltFilter filter;
  for (int i = 0; i < 5; ++i) filter.follow({}, at_rest(i == 0 ? 0.2 : 1.0, 0.0), 0.001, std::nan(""));
  EXPECT_NEAR(filter.roll(), 0.2, 1e-12);
}

TEST(Tilt, TheFirstDirectionIsAMean) {
  TiltFilter filter;
  for (int i = 0; i < 50; ++i) filter.follow({}, at_rest(i % 2 == 0 ? 0.1 : -0.1, 0.0), 0.001, 0.5);
  EXPECT_NEAR(filter.roll(), 0.0, 0.005);
}

TEST(Tilt, CountsAsUpsideDownUntilTheFirstDirection) {
  TiltFilter filter;
  EXPECT_NEAR(std::fabs(filter.roll()), 180.0 * kDegree, 1e-12);
  filter.follow({}, Acceleration{}, 0.001, 0.5);
  EXPECT_NEAR(std::fabs(filter.roll()), 180.0 * kDegree, 1e-12);
  filter.follow({}, Acceleration{1e308, 1e308, 1e308}, 0.001, 0.5);
  EXPECT_NEAR(std::fabs(filter.roll()), 180.0 * kDegree, 1e-12);
  filter.follow({}, at_rest(0.1, 0.0), 0.001, 0.5);
  EXPECT_NEAR(filter.roll(), 0.1, 1e-12);
  filter.reset();
  EXPECT_NEAR(std::fabs(filter.roll()), 180.0 * kDegree, 1e-12);
}

}  // namespace
}  // namespace pastern::safety
