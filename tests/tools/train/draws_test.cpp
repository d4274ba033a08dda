// Random numbers of training.
#include "tools/train/draws.h"

#include <gtest/gtest.h>

#include <cmath>
#include <set>

namespace pastern::tools {
namespace {

// Random123's known answers for Philox4x32-10 (kat_vectors of its distribution): counter and key all zero.
// Purpose 0 does not exist, so the block is reached with a purpose whose number is 0.
TEST(TrainingDraws, AreTheKnownPhiloxWords) {
  Draws draws(0, static_cast<Purpose>(0), 0);
  EXPECT_EQ(draws.word(), 0x6627e8d5U);
  EXPECT_EQ(draws.word(), 0xe169c58dU);
  EXPECT_EQ(draws.word(), 0xbc57ac4cU);
  EXPECT_EQ(draws.word(), 0x9b00dbd8U);
}

TEST(TrainingDraws, DependOnSeedPurposeAndIndexAlone) {
  std::set<std::uint64_t> seen;
  for (const std::uint64_t seed : {0ULL, 1ULL, 1ULL << 32U}) {
    for (const Purpose purpose : {Purpose::direction, Purpose::site, Purpose::walk}) {
      for (const std::uint64_t index : {0ULL, 1ULL, 1ULL << 32U}) {
        const std::uint64_t word = Draws(seed, purpose, index).word64();
        EXPECT_EQ(word, Draws(seed, purpose, index).word64());
        seen.insert(word);
      }
    }
  }
  EXPECT_EQ(seen.size(), 27U);
}

// Bounds are five standard errors: mean sd/sqrt(n), variance sqrt(2/n), fourth moment sqrt(96/n) of a
// standard normal.
TEST(TrainingDraws, NormalsHaveTheMomentsOfNormals) {
  constexpr int kCount = 200'000;
  Draws draws(3, Purpose::walk, 5);
  double sum = 0;
  double square = 0;
  double fourth = 0;
  for (int i = 0; i < kCount; ++i) {
    const double z = draws.normal();
    sum += z;
    square += z * z;
    fourth += z * z * z * z;
  }
  EXPECT_NEAR(sum / kCount, 0, 5 / std::sqrt(kCount));
  EXPECT_NEAR(square / kCount, 1, 5 * std::sqrt(2.0 / kCount));
  EXPECT_NEAR(fourth / kCount, 3, 5 * std::sqrt(96.0 / kCount));
}

TEST(TrainingDraws, UniformsStayInsideAndFillTheirRange) {
  Draws draws(4, Purpose::site, 1);
  double low = 1;
  double high = 0;
  for (int i = 0; i < 10'000; ++i) {
    const double u = draws.uniform();
    ASSERT_GT(u, 0);
    ASSERT_LT(u, 1);
    low = std::min(low, u);
    high = std::max(high, u);
  }
  EXPECT_LT(low, 0.001);
  EXPECT_GT(high, 0.999);
}

}  // namespace
}  // namespace pastern::tools
