// Random numbers by lanes: known answers of the generator, and lane = the simulated robot's own numbers.
#include "tools/packed/random.h"

#include <gtest/gtest.h>

#include "hal_stub/robot/random.h"

namespace pastern::packed::PASTERN_LANES_SET {
namespace {

template <int N>
FourWords<N> words_at(std::uint64_t seed, std::uint64_t draw, std::uint32_t tick, std::uint32_t part) {
  std::array<std::array<std::uint32_t, N>, 4> counter{};
  std::array<std::uint32_t, N> low{};
  std::array<std::uint32_t, N> high{};
  for (std::uint32_t i = 0; i < N; ++i) {
    const std::uint64_t own = seed * (i + 1);
    low[i] = static_cast<std::uint32_t>(own);
    high[i] = static_cast<std::uint32_t>(own >> 32U);
    counter[0][i] = tick + i;
    counter[1][i] = (4U << 24U) | part;
    counter[2][i] = static_cast<std::uint32_t>(draw);
    counter[3][i] = static_cast<std::uint32_t>(draw >> 32U);
  }
  const FourWords<N> words = {Words<N>::of(counter[0]), Words<N>::of(counter[1]), Words<N>::of(counter[2]),
                              Words<N>::of(counter[3])};
  return philox<N>(words, Words<N>::of(low), Words<N>::of(high));
}

template <int N>
void lanes_are_the_plain_words() {
  const std::uint64_t seed = 0x9f3c5a7700d1e2b3U;
  const std::uint64_t draw = 0x123456789abcdef0U;
  for (std::uint32_t tick = 0; tick < 300; ++tick) {
    const auto words = words_at<N>(seed, draw, tick * 7919, tick);
    const auto even = uniform_of<double>(words[0]);
    const auto single = uniform_of<float>(words[1]);
    const auto rough = rough_normal_of<double>(words[2]);
    Lanes<double, (N < 8 ? N : 8)> normal(0);
    if constexpr (N <= 8) normal = normal_of<double>(words[0], words[3]);
    for (int i = 0; i < N; ++i) {
      const auto plain =
          stub::random_words(seed * static_cast<std::uint64_t>(i + 1), draw,
                             tick * 7919 + static_cast<std::uint32_t>(i), stub::Chance::sensors, tick);
      for (std::size_t k = 0; k < 4; ++k) EXPECT_EQ(words[k][i], plain[k]);
      EXPECT_EQ(even[i], stub::uniform_of(plain[0]));
      EXPECT_NEAR(single[i], stub::uniform_of(plain[1]), 0x1p-23);
      EXPECT_EQ(rough[i], stub::rough_normal_of(plain[2]));
      if (N <= 8) {
        EXPECT_NEAR(normal[i], stub::normal_of(plain[0], plain[3]), 1e-14);
      }
    }
  }
}

TEST(Random, LanesAreTheSimulatedRobotsOwnNumbers) {
  lanes_are_the_plain_words<2>();
  lanes_are_the_plain_words<4>();
  lanes_are_the_plain_words<8>();
  lanes_are_the_plain_words<16>();
}

// Known answers that come with Random123 (kat_vectors, philox4x32 10).
TEST(Random, KnownAnswersOfTheGenerator) {
  constexpr int n = kFloatLanes;
  const auto run = [](std::array<std::uint32_t, 4> c, std::uint32_t k0, std::uint32_t k1) {
    return philox<n>({Words<n>(c[0]), Words<n>(c[1]), Words<n>(c[2]), Words<n>(c[3])}, Words<n>(k0),
                     Words<n>(k1));
  };
  const std::array<std::uint32_t, 4> zeros = {0x6627e8d5U, 0xe169c58dU, 0xbc57ac4cU, 0x9b00dbd8U};
  const std::array<std::uint32_t, 4> ones = {0x408f276dU, 0x41c83b0eU, 0xa20bc7c6U, 0x6d5451fdU};
  const std::array<std::uint32_t, 4> pi = {0xd16cfe09U, 0x94fdcceb, 0x5001e420U, 0x24126ea1U};
  const auto a = run({0, 0, 0, 0}, 0, 0);
  const auto b = run({~0U, ~0U, ~0U, ~0U}, ~0U, ~0U);
  const auto c = run({0x243f6a88U, 0x85a308d3U, 0x13198a2eU, 0x03707344U}, 0xa4093822U, 0x299f31d0U);
  for (std::size_t k = 0; k < 4; ++k) {
    for (int i = 0; i < n; ++i) {
      EXPECT_EQ(a[k][i], zeros[k]);
      EXPECT_EQ(b[k][i], ones[k]);
      EXPECT_EQ(c[k][i], pi[k]);
    }
  }
}

TEST(Random, UniformNumbersMeetNeitherEnd) {
  constexpr int n = kFloatLanes;
  EXPECT_GT(uniform_of<float>(Words<n>(0))[0], 0.0F);
  EXPECT_LT(uniform_of<float>(Words<n>(~0U))[0], 1.0F);
  EXPECT_GT(uniform_of<double>(Words<n>(0))[0], 0.0);
  EXPECT_LT(uniform_of<double>(Words<n>(~0U))[0], 1.0);
  EXPECT_EQ(number_of<double>(Words<n>(~0U))[0], 4294967295.0);
}

}  // namespace
}  // namespace pastern::packed::PASTERN_LANES_SET
