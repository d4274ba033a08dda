// Ranks, Adam and the gradient's estimate.
#include "tools/train/evolution.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

namespace pastern::tools {
namespace {

TEST(RankWeights, AreRanksOfTheSizesWithTheirSigns) {
  EXPECT_EQ(rank_weights({0.1, -5, 0.3, 2}), (std::vector<double>{0.25, -1, 0.5, 0.75}));
}

TEST(RankWeights, EqualSizesShareTheirRank) {
  EXPECT_EQ(rank_weights({1, -1, 3, 3}), (std::vector<double>{0.375, -0.375, 0.875, 0.875}));
}

TEST(RankWeights, ZeroAndNotANumberWeighNothing) {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  EXPECT_EQ(rank_weights({0, nan, 2}), (std::vector<double>{0, 0, 1}));
  EXPECT_TRUE(rank_weights({}).empty());
}

TEST(RankWeights, DoNotChangeUnderAnyOddMonotoneChange) {
  const std::vector<double> differences{0.4, -0.2, 1.7, -3, 0.01, -0.9};
  std::vector<double> changed;
  for (const double d : differences) changed.push_back(d * d * d + 5 * d);
  changed[3] = -std::numeric_limits<double>::infinity();  // a fall may cost without bound
  EXPECT_EQ(rank_weights(differences), rank_weights(changed));
}

// arXiv:1412.6980, section 2: with bias correction the first step is step * g/|g| in every coordinate,
// whatever the size.
TEST(AdamSteps, TheFirstIsTheStepItselfInEveryCoordinate) {
  Adam adam;
  Parameters x{1, 2, 3};
  adam.ascend({1e-3, -40, 7}, 0.01, x);
  EXPECT_NEAR(x[0], 1.01, 1e-6);
  EXPECT_NEAR(x[1], 1.99, 1e-9);
  EXPECT_NEAR(x[2], 3.01, 1e-9);
}

// Two steps by hand with gradients 1 and 3: m = 0.9*0.1 + 0.3 = 0.39, v = 0.999*0.001 + 0.009 = 0.009999;
// corrected by 1 - 0.81 and 1 - 0.998001.
TEST(AdamSteps, TheSecondFollowsTheMoments) {
  Adam adam;
  Parameters x{0};
  adam.ascend({1}, 0.01, x);
  const double first = x[0];
  adam.ascend({3}, 0.01, x);
  EXPECT_NEAR(x[0] - first, 0.01 * (0.39 / 0.19) / std::sqrt(0.009999 / 0.001999), 1e-9);
}

// E[(a.g) g] = a for g ~ N(0, 1): each coordinate's sample mean has variance (|a|^2 + a_j^2)/n. Bound: five
// standard errors.
TEST(Gradient, OfALinearFunctionIsItsSlope) {
  constexpr std::size_t kCount = 40'000;
  const Parameters slope{1, -2, 0.5};
  std::vector<Parameters> directions(kCount, Parameters(3));
  std::vector<double> weights(kCount);
  for (std::size_t i = 0; i < kCount; ++i) {
    draw_direction(9, 3, i, directions[i]);
    for (std::size_t j = 0; j < 3; ++j) weights[i] += slope[j] * directions[i][j];
  }
  const Parameters gradient = gradient_of(weights, directions);
  const double norm = 1 + 4 + 0.25;
  for (std::size_t j = 0; j < 3; ++j) {
    EXPECT_NEAR(gradient[j], slope[j], 5 * std::sqrt((norm + slope[j] * slope[j]) / kCount));
  }
}

TEST(Directions, AreAFunctionOfSeedIterationAndIndex) {
  Parameters a(8);
  Parameters b(8);
  draw_direction(1, 2, 3, a);
  draw_direction(1, 2, 3, b);
  EXPECT_EQ(a, b);
  draw_direction(1, 3, 2, b);
  EXPECT_NE(a, b);
}

}  // namespace
}  // namespace pastern::tools
