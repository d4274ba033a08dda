// The sign-flip test against worked examples, its interval against the order statistics of subset means.
#include "runtime/adapt/confirm.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

#include "runtime/adapt/random.h"

namespace pastern::adapt {
namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();

// Darwin's maize, eighths of an inch (Fisher, The Design of Experiments, 1935, sec. 21; figures from memory,
// reproduced with R 4.2.2).
const std::vector<double> kMaize{49, -67, 8, 16, 6, 23, 28, 41, 14, 29, 56, 24, 75, 60, -48};

// All sign patterns one by one: slow, and as plain as the definition.
double by_enumeration(const std::vector<double>& d) {
  double observed = 0;
  double magnitude = 0;
  for (const double x : d) {
    observed += x;
    magnitude += std::abs(x);
  }
  std::uint64_t count = 0;
  for (std::uint64_t pattern = 0; pattern < (std::uint64_t{1} << d.size()); ++pattern) {
    double sum = 0;
    for (std::size_t i = 0; i < d.size(); ++i) sum += ((pattern >> i) & 1U) != 0 ? -d[i] : d[i];
    if (sum >= observed - 1e-12 * magnitude) ++count;
  }
  return static_cast<double>(count) / std::ldexp(1.0, static_cast<int>(d.size()));
}

// Hartigan's rule: the end is the k-th least mean of the 2^n - 1 non-empty subsets.
Interval by_subset_means(const std::vector<double>& d, double level) {
  std::vector<double> means;
  for (std::uint64_t subset = 1; subset < (std::uint64_t{1} << d.size()); ++subset) {
    double sum = 0;
    int count = 0;
    for (std::size_t i = 0; i < d.size(); ++i) {
      if (((subset >> i) & 1U) == 0) continue;
      sum += d[i];
      ++count;
    }
    means.push_back(sum / count);
  }
  std::sort(means.begin(), means.end());
  const auto k = static_cast<std::size_t>((1 - level) / 2 * std::ldexp(1.0, static_cast<int>(d.size())));
  return {means[k - 1], means[means.size() - k]};
}

std::vector<double> normals(std::uint32_t draw, std::size_t count, double shift) {
  std::vector<double> values;
  for (std::uint32_t i = 0; i < count; ++i)
    values.push_back(shift + random_normal(11, Stream::test, draw, i));
  return values;
}

TEST(SignFlip, GivesFishersCountOnTheMaize) {
  EXPECT_DOUBLE_EQ(sign_flip_p(kMaize) * 32768, 863);  // 835 above the observed sum, 28 equal to it
  EXPECT_NEAR(sign_flip_p(kMaize), 0.02633666992, 1e-9);
  EXPECT_NEAR(2 * sign_flip_p(kMaize), 0.05267333984, 1e-9);
}

TEST(SignFlip, GivesRsValueOnTheSleepData) {
  // Student's sleep data (R datasets::sleep); two-sided sign-flip p computed with R 4.2.2.
  const std::vector<double> sleep{1.2, 2.4, 1.3, 1.3, 0, 1, 1.8, 0.8, 4.6, 1.4};
  EXPECT_NEAR(2 * sign_flip_p(sleep), 0.00390625, 1e-9);
}

TEST(SignFlip, AgreesWithPlainEnumeration) {
  for (std::uint32_t draw = 0; draw < 40; ++draw) {
    std::vector<double> d = normals(draw, 1 + draw % 12, 0.3);
    if (draw % 3 == 0)
      for (double& x : d) x = std::round(4 * x) / 10;  // ties, and tenths that are no binary fractions
    EXPECT_DOUBLE_EQ(sign_flip_p(d), by_enumeration(d)) << "draw " << draw;
  }
}

TEST(SignFlip, CannotReachFivePercentWithFewerThanFivePairs) {
  for (std::size_t n = 1; n <= 4; ++n) EXPECT_GT(sign_flip_p(std::vector<double>(n, 1.0)), 0.05);
  EXPECT_DOUBLE_EQ(sign_flip_p(std::vector<double>(5, 1.0)), 1.0 / 32);
  EXPECT_DOUBLE_EQ(sign_flip_p(std::vector<double>(24, 1.0)), 0x1p-24);
}

TEST(SignFlip, SaysOneWhenNothingCanBeSaid) {
  EXPECT_EQ(sign_flip_p({}), 1.0);
  EXPECT_EQ(sign_flip_p({0, 0, 0, 0, 0, 0}), 1.0);
  EXPECT_EQ(sign_flip_p({1, 1, 1, 1, 1, std::nan("")}), 1.0);
  EXPECT_EQ(sign_flip_p({1, 1, 1, 1, 1, kInfinity}), 1.0);
  EXPECT_THROW((void)sign_flip_p(std::vector<double>(25, 1.0)), std::invalid_argument);
}

TEST(SignFlip, IsSideSensitiveAndScaleFree) {
  std::vector<double> losses;
  std::vector<double> large;
  for (const double d : kMaize) {
    losses.push_back(-d);
    large.push_back(1e300 * d / 1e3);
  }
  EXPECT_DOUBLE_EQ(sign_flip_p(losses), (32768.0 - 835) / 32768);  // all patterns but those above
  EXPECT_DOUBLE_EQ(sign_flip_p(large), 863.0 / 32768);
}

TEST(SignFlip, RejectsANullAtMostAsOftenAsItSays) {
  int rejected = 0;
  constexpr int kTrials = 4000;
  for (std::uint32_t draw = 0; draw < kTrials; ++draw)
    rejected += sign_flip_p(normals(1000 + draw, 8, 0.0)) <= 0.05 ? 1 : 0;
  // Attained level with 8 pairs: 12/256 = .046875; four standard errors.
  EXPECT_NEAR(rejected / static_cast<double>(kTrials), 12.0 / 256, 4 * std::sqrt(0.0469 * 0.953 / kTrials));
}

TEST(SignFlipInterval, MatchesTheOrderStatisticsOfSubsetMeans) {
  for (const double level : {0.90, 0.95, 0.99}) {
    const Interval expected = by_subset_means(kMaize, level);
    const Interval found = sign_flip_interval(kMaize, level);
    EXPECT_NEAR(found.low, expected.low, 1e-9) << level;
    EXPECT_NEAR(found.high, expected.high, 1e-9) << level;
  }
  const std::vector<double> eight = normals(3, 8, 0.5);
  EXPECT_NEAR(sign_flip_interval(eight, 0.9).low, by_subset_means(eight, 0.9).low, 1e-9);
  EXPECT_NEAR(sign_flip_interval(eight, 0.9).high, by_subset_means(eight, 0.9).high, 1e-9);
}

TEST(SignFlipInterval, ExcludesZeroExactlyWhenTheTestRejects) {
  int rejected = 0;
  for (std::uint32_t draw = 0; draw < 300; ++draw) {
    const std::vector<double> d = normals(8000 + draw, 8, 0.6);
    const bool rejects = sign_flip_p(d) <= 0.05;
    rejected += rejects ? 1 : 0;
    EXPECT_EQ(sign_flip_interval(d, 0.9).low > 0, rejects) << "draw " << draw;
  }
  EXPECT_GT(rejected, 50);
  EXPECT_LT(rejected, 250);
}

TEST(SignFlipInterval, CoversTheTruthAsOftenAsItSays) {
  int covered = 0;
  constexpr int kTrials = 2000;
  for (std::uint32_t draw = 0; draw < kTrials; ++draw) {
    const Interval interval = sign_flip_interval(normals(20000 + draw, 8, 0.3), 0.9);
    covered += interval.low <= 0.3 && 0.3 <= interval.high ? 1 : 0;
  }
  // 8 pairs at 90 %: 1 - 2 * 12/256; four standard errors.
  EXPECT_NEAR(covered / static_cast<double>(kTrials), 1 - 24.0 / 256, 4 * std::sqrt(0.906 * 0.094 / kTrials));
}

TEST(SignFlipInterval, IsInfiniteWithTooFewPairs) {
  EXPECT_EQ(sign_flip_interval({1, 2, 3, 4}, 0.9).low, -kInfinity);
  EXPECT_EQ(sign_flip_interval({1, 2, 3, 4, 5}, 0.95).high, kInfinity);
  EXPECT_EQ(sign_flip_interval({}, 0.9).high, kInfinity);
  EXPECT_EQ(sign_flip_interval({1, 2, 3, 4, 5, std::nan("")}, 0.9).low, -kInfinity);
  const Interval five = sign_flip_interval({5, 3, 1, 2, 4}, 0.9);  // k = 1: least and largest difference
  EXPECT_DOUBLE_EQ(five.low, 1);
  EXPECT_DOUBLE_EQ(five.high, 5);
}

TEST(SignFlipInterval, OfEqualDifferencesIsThatDifference) {
  const Interval interval = sign_flip_interval(std::vector<double>(8, 0.25), 0.9);
  EXPECT_NEAR(interval.low, 0.25, 1e-9);
  EXPECT_NEAR(interval.high, 0.25, 1e-9);
}

TEST(SignFlipInterval, RefusesALevelThatIsNone) {
  for (const double level : {0.0, 1.0, -0.5, std::nan("")})
    EXPECT_THROW((void)sign_flip_interval(kMaize, level), std::invalid_argument);
}

TEST(Order, IsAFairCoinAndAPureFunctionOfTheSeed) {
  int first = 0;
  int changes = 0;
  for (std::uint64_t seed = 0; seed < 2000; ++seed) {
    for (std::uint32_t pair = 0; pair < 8; ++pair) {
      first += adapted_walks_first(seed, pair) ? 1 : 0;
      changes += adapted_walks_first(seed, pair) != adapted_walks_first(seed, pair + 1) ? 1 : 0;
      EXPECT_EQ(adapted_walks_first(seed, pair), adapted_walks_first(seed, pair));
    }
  }
  const double tolerance = 4 * std::sqrt(16000 * 0.25);
  EXPECT_NEAR(first, 8000, tolerance);
  EXPECT_NEAR(changes, 8000, tolerance);
}

}  // namespace
}  // namespace pastern::adapt
