// Whole ticks from seconds and clocks.
#include "safety/timing.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace pastern::safety {
namespace {

TEST(Timing, HoldTimesRoundUpAndNonsenseIsAtOnce) {
  EXPECT_EQ(hold_ticks(0.05, 0.001), 50);
  EXPECT_EQ(hold_ticks(0.0501, 0.001), 51);
  EXPECT_EQ(hold_ticks(0.0, 0.001), 0);
  EXPECT_EQ(hold_ticks(-1.0, 0.001), 0);
  EXPECT_EQ(hold_ticks(std::nan(""), 0.001), 0);
  EXPECT_EQ(hold_ticks(std::numeric_limits<double>::infinity(), 0.001), kLongestTicks);
  // 0.3 / 0.1 is not 3 in binary, nor is 0.7 / 0.1 seven.
  EXPECT_EQ(hold_ticks(0.3, 0.1), 3);
  EXPECT_EQ(hold_ticks(0.7, 0.1), 7);
}

TEST(Timing, ATickPeriodThatMakesNoSenseBecomesAMillisecond) {
  for (const double bad : {0.0, -0.001, 1e-6, 5.0, std::nan(""), std::numeric_limits<double>::infinity()}) {
    EXPECT_EQ(sound_tick_s(bad), 0.001) << bad;
  }
  EXPECT_EQ(sound_tick_s(0.0002), 0.0002);
  EXPECT_EQ(sound_tick_s(0.01), 0.01);
}

TEST(Timing, SpansRoundDown) {
  EXPECT_EQ(ticks_within(0.05, 0.001), 50);
  EXPECT_EQ(ticks_within(0.0509, 0.001), 50);
  EXPECT_EQ(ticks_within(0.3, 0.1), 3);
  EXPECT_EQ(ticks_within(std::nan(""), 0.001), 0);
}

TEST(Timing, JitterOfTheCallsDoesNotAddUp) {
  TickCounter counter(0.001);
  std::int64_t sum = 0;
  // 100 s at 1 kHz, each call late by 0 or 0.7 ms in turn.
  for (std::int64_t i = 0; i < 100'000; ++i) {
    sum += counter.advance(TimeNs{5'000'000'000 + i * 1'000'000 + (i % 2) * 700'000});
  }
  EXPECT_GE(sum, 100'000);
  EXPECT_LE(sum, 100'002);
}

TEST(Timing, AStallCountsTheTicksThatWereMissed) {
  TickCounter counter(0.001);
  EXPECT_EQ(counter.advance(TimeNs{0}), 1);
  EXPECT_EQ(counter.advance(TimeNs{1'000'000}), 1);
  EXPECT_EQ(counter.advance(TimeNs{19'000'000}), 18);
  EXPECT_EQ(counter.advance(TimeNs{20'000'000}), 1);
  EXPECT_EQ(counter.advance(TimeNs{25'600'000}), 6);  // to the nearest
  EXPECT_EQ(counter.advance(TimeNs{35'400'000}), 9);
}

TEST(Timing, AClockThatStandsStillOrGoesBackCountsOneTickACall) {
  TickCounter counter(0.001);
  for (int i = 0; i < 1000; ++i) EXPECT_EQ(counter.advance(TimeNs{7}), 1);
  EXPECT_EQ(counter.advance(TimeNs{6}), 1);
  EXPECT_EQ(counter.advance(TimeNs{std::numeric_limits<std::int64_t>::min()}), 1);
  EXPECT_EQ(counter.advance(TimeNs{std::numeric_limits<std::int64_t>::max()}), kLongestTicks);
}

TEST(Timing, AHoldClockCountsFromTheFirstTickAndForgetsAtTheFirstBreak) {
  HoldClock clock;
  clock.look(true, 1);
  EXPECT_TRUE(clock.reached(0));
  EXPECT_FALSE(clock.reached(1));
  clock.look(true, 4);
  EXPECT_EQ(clock.ticks(), 4);
  clock.look(false, 1);
  EXPECT_FALSE(clock.reached(0));
  clock.look(true, 1);
  EXPECT_EQ(clock.ticks(), 0);
}

}  // namespace
}  // namespace pastern::safety
