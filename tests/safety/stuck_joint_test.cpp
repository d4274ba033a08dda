// One encoder that is stuck while its joint moves: joint 1 of three, ten frames of grace, then 0.2 of the
// 0.2 rad of a jump, within 250 frames.
#include <algorithm>
#include <cmath>

#include "tests/safety/fixture.h"
#include "tests/safety/hard_numbers.h"

namespace pastern::safety {
namespace {

using test::Loop;

class StuckJoint : public testing::Test {
 protected:
  /// The joint moves by `speed` and its encoder says so, in steps of `step` (0: without).
  void move(double speed, int ticks, double step = 0.0) {
    for (int i = 0; i < ticks; ++i) {
      at += speed * test::kTick;
      loop.frame.speed[1] = speed;
      loop.frame.angle[1] = step > 0.0 ? step * std::floor(at / step) : at;
      (void)loop.tick();
    }
  }
  [[nodiscard]] bool armed() const { return loop.gate.phase() == Phase::armed; }

  Loop loop;
  double at{0.2};
};

TEST_F(StuckJoint, TripsWhenItsOwnSpeedSaysThatItMoved) {
  for (const double speed : {1.0, -1.0, 4.0, 0.25}) {
    loop = Loop();
    at = 0.2;
    move(speed, 50);
    ASSERT_TRUE(armed());
    const int ticks = loop.ticks_to_trip(500);
    EXPECT_NEAR(ticks, 10 + 0.04 / (std::fabs(speed) * test::kTick), 1.01) << speed;
    EXPECT_EQ(loop.gate.trip().cause, Cause::frame_frozen);
    EXPECT_EQ(loop.gate.trip().joint, 1);
    EXPECT_EQ(loop.gate.trip().value, ticks);
    EXPECT_EQ(loop.gate.trip().limit, 10);
    EXPECT_NEAR(loop.gate.trip().held_s, ticks * test::kTick, 1e-12);
    EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);
  }
}

TEST_F(StuckJoint, IsFoundWhenAngleAndSpeedComeLessOften) {
  move(1.0, 50);
  int ticks = 0;
  for (; armed() && ticks < 500; ++ticks) {
    loop.flags.frame_new = ticks % 3 == 0;
    (void)loop.tick();
  }
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_frozen);
  EXPECT_NEAR(ticks, 3 * 10 + 40, 6);  // frames of grace, but the way over the ticks that went by
}

TEST_F(StuckJoint, IsNotSeenInAMovingJointThoughItsStepsAreCoarse) {
  for (const double speed : {0.02, 0.1, -0.3, 1.0, -3.0, 6.0}) {
    loop = Loop();
    at = speed > 0 ? -0.5 : 1.5;
    const int ticks = static_cast<int>(std::min(1.9 / std::fabs(speed) / test::kTick, 20e3));
    move(speed, ticks, 0.01);
    EXPECT_TRUE(armed()) << speed << " rad/s " << name(loop.gate.trip().cause);
  }
}

TEST_F(StuckJoint, IsNotSeenInAStandingJointWithANoisySpeedOfAnOffset) {
  test::Dice dice(5);
  for (const double offset : {0.0, 0.1, -0.1}) {
    loop = Loop();
    for (int i = 0; i < 20'000; ++i) {  // it sways by 4 mrad within one step of 10
      loop.frame.speed[1] = offset + 0.02 * std::cos(0.005 * i) + dice.between(-0.2, 0.2);
      (void)loop.tick();
    }
    EXPECT_TRUE(armed()) << offset;
  }
}

TEST_F(StuckJoint, IsNotSeenWhenAFilteredSpeedGoesOnAfterAStop) {
  move(10.0, 20);
  for (int i = 1; i < 500; ++i) {  // a filter of 5 ms
    loop.frame.speed[1] = 10.0 * std::exp(-i / 5.0);
    (void)loop.tick();
  }
  EXPECT_TRUE(armed());
}

TEST_F(StuckJoint, OneChangeBeginsTheCountAnew) {
  for (int i = 0; i < 40; ++i) {
    loop.frame.angle[1] += 0.0004;
    loop.frame.speed[1] = 1.0;
    loop.ticks(40);
  }
  EXPECT_TRUE(armed());
}

TEST_F(StuckJoint, MayBeMovedByHandWhileParkedAndDoesNotStandInTheWayOfARelease) {
  loop.flags.torque_wanted = false;
  loop.frame.speed[1] = 2.0;
  loop.ticks(1000);
  EXPECT_TRUE(armed());
  loop.flags.torque_wanted = true;
  EXPECT_LT(loop.ticks_to_trip(100), 50);
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_frozen);
  loop.flags.torque_wanted = false;
  loop.ticks(2);
  EXPECT_TRUE(loop.gate.release());
}

TEST_F(StuckJoint, WithASpeedThatIsNoNumberItIsTheNumberThatCounts) {
  move(1.0, 20);
  loop.ticks(15);
  loop.frame.speed[1] = test::kNan;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_not_finite);
}

}  // namespace
}  // namespace pastern::safety
