// Random robots under random torques: nothing is not a number, no energy from nowhere, nothing stays sunk.
#include "tests/hal_stub/random_robot.h"

#include <gtest/gtest.h>

namespace pastern::stub {
namespace {

TEST(RandomRobots, ThrashWithoutNanEnergyFromNowhereOrSinking) {
  int branches = 0;
  int slides = 0;
  for (std::uint64_t seed = 1; seed <= 50; ++seed) {
    const Thrashed seen = thrash(seed, 3);
    EXPECT_EQ(seen.refused, "") << seed;
    EXPECT_TRUE(seen.finite) << seed;
    EXPECT_LT(seen.won_share, 1) << seed;
    EXPECT_LT(seen.allowed_j, 0.2 * seen.work_j) << seed << ": the tolerance would say nothing";
    EXPECT_LE(seen.deep_s, 0.05) << seed;
    EXPECT_GT(seen.work_j, 10) << seed;
    branches += seen.branches ? 1 : 0;
    slides += seen.slides ? 1 : 0;
  }
  EXPECT_GT(branches, 8);
  EXPECT_GT(slides, 8);
}

// Else the tolerance would not be one of the integrator.
TEST(RandomRobots, WhatTheStepMayWinIsOfItsFirstOrder) {
  double allowed[2] = {0, 0};
  for (std::uint64_t seed = 1; seed <= 8; ++seed) {
    allowed[0] += thrash(seed, 3, 1).allowed_j;
    allowed[1] += thrash(seed, 3, 4).allowed_j;
  }
  EXPECT_NEAR(allowed[0] / allowed[1], 4, 1.2);
}

}  // namespace
}  // namespace pastern::stub
