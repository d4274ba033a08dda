// Philox4x32-10 against the known answers of Random123's kat_vectors; the distributions against their
// moments.
#include "runtime/adapt/random.h"

#include <Random123/philox.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <set>
#include <vector>

namespace pastern::adapt {
namespace {

constexpr Stream stream_of(std::uint32_t word) { return static_cast<Stream>(word); }

TEST(Random, MatchesTheKnownAnswersOfPhilox4x32With10Rounds) {
  // Random123 1.14.0, tests/kat_vectors: words 0 and 1 of each answer, word 0 in the low half.
  EXPECT_EQ(random_bits(0, stream_of(0), 0, 0, 0), 0xe169c58d6627e8d5U);
  const std::uint32_t ones = 0xffffffff;
  EXPECT_EQ(random_bits(~std::uint64_t{0}, stream_of(ones), ones, ones, ones), 0x41c83b0e408f276dU);
  EXPECT_EQ(random_bits(0x299f31d0a4093822U, stream_of(0x03707344), 0x243f6a88, 0x85a308d3, 0x13198a2e),
            0x94fdccebd16cfe09U);
}

TEST(Random, NormalsUseAllFourWordsOfTheBlock) {
  // The answer to the all-zero block is 6627e8d5 e169c58d bc57ac4c 9b00dbd8 (kat_vectors).
  const double u = (static_cast<double>(0xe169c58d6627e8d5U >> 12U) + 0.5) * 0x1p-52;
  const double v = (static_cast<double>(0x9b00dbd8bc57ac4cU >> 12U) + 0.5) * 0x1p-52;
  const double expected = std::sqrt(-2 * std::log(u)) * std::cos(2 * 3.14159265358979323846 * v);
  EXPECT_NEAR(random_normal(0, stream_of(0), 0, 0, 0), expected, 1e-15);
}

TEST(Random, EveryCoordinateMatters) {
  std::set<std::uint64_t> seen;
  for (std::uint32_t i = 0; i < 50; ++i) {
    seen.insert(random_bits(i + 1, Stream::test, 0, 0, 0));
    seen.insert(random_bits(std::uint64_t{i + 1} << 32U, Stream::test, 0, 0, 0));
    seen.insert(random_bits(0, Stream::test, i + 1, 0, 0));
    seen.insert(random_bits(0, Stream::test, 0, i + 1, 0));
    seen.insert(random_bits(0, Stream::test, 0, 0, i + 1));
    seen.insert(random_bits(0, stream_of(200 + i), 0, 0, 0));
  }
  EXPECT_EQ(seen.size(), 300U);
}

TEST(Random, UniformsStayInsideTheOpenIntervalAndAreSpreadEvenly) {
  std::vector<double> draws;
  for (std::uint32_t i = 0; i < 20000; ++i) draws.push_back(random_uniform(5, Stream::test, i, 1));
  std::sort(draws.begin(), draws.end());
  EXPECT_GT(draws.front(), 0.0);
  EXPECT_LT(draws.back(), 1.0);
  double distance = 0;  // Kolmogorov-Smirnov; 1.95 / sqrt(n) is its 0.1 % point (from memory)
  for (std::size_t i = 0; i < draws.size(); ++i)
    distance = std::max(distance, std::abs(draws[i] - (static_cast<double>(i) + 0.5) / 20000.0));
  EXPECT_LT(distance, 1.95 / std::sqrt(20000.0));
}

TEST(Random, NormalsHaveTheMomentsOfTheStandardNormal) {
  constexpr std::uint32_t kDraws = 100000;
  double one = 0;
  double two = 0;
  double four = 0;
  double lag = 0;
  double last = 0;
  for (std::uint32_t i = 0; i < kDraws; ++i) {
    const double g = random_normal(9, Stream::perturbation, i / 1000, i % 1000, 7);
    one += g;
    two += g * g;
    four += g * g * g * g;
    lag += g * last;
    last = g;
  }
  // Five standard errors: variances of g, g^2, g^4 and g g' are 1, 2, 96 and 1.
  const double root = std::sqrt(static_cast<double>(kDraws));
  EXPECT_NEAR(one / kDraws, 0, 5 / root);
  EXPECT_NEAR(two / kDraws, 1, 5 * std::sqrt(2.0) / root);
  EXPECT_NEAR(four / kDraws, 3, 5 * std::sqrt(96.0) / root);
  EXPECT_NEAR(lag / kDraws, 0, 5 / root);
}

}  // namespace
}  // namespace pastern::adapt
