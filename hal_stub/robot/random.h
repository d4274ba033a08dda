// Counter-based random numbers of the simulated robot: Philox4x32-10 of Random123 (Salmon et al., SC 2011). A
// number is a pure function of seed, draw, tick and stream.
#pragma once

#include <Random123/philox.h>

#include <array>
#include <cmath>
#include <cstdint>
#include <numbers>

namespace pastern::stub {

/// Purposes, so that one set of coordinates never serves two.
enum class Chance : std::uint32_t {
  robot = 0,
  place = 1,
  push = 2,
  jitter = 3,
  sensors = 4,
  site = 5,
  frames = 6
};

using Words = std::array<std::uint32_t, 4>;

/// `part` is below 2^24.
inline Words random_words(std::uint64_t seed, std::uint64_t draw, std::uint32_t tick, Chance chance,
                          std::uint32_t part) noexcept {
  const r123::Philox4x32::key_type key = {
      {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32U)}};
  const r123::Philox4x32::ctr_type counter = {{tick, (static_cast<std::uint32_t>(chance) << 24U) | part,
                                               static_cast<std::uint32_t>(draw),
                                               static_cast<std::uint32_t>(draw >> 32U)}};
  const auto words = r123::Philox4x32()(counter, key);
  return {words[0], words[1], words[2], words[3]};
}

/// Uniform in (0, 1).
inline double uniform_of(std::uint32_t word) noexcept { return (static_cast<double>(word) + 0.5) * 0x1p-32; }

/// Standard normal of two words (Box and Muller, Ann. Math. Stat. 29(2), 1958).
inline double normal_of(std::uint32_t a, std::uint32_t b) noexcept {
  return std::sqrt(-2 * std::log(uniform_of(a))) * std::cos(2 * std::numbers::pi * uniform_of(b));
}

/// Mean 0, variance 1, nearly normal, never beyond 3.46: the sum of a word's four bytes. For sensor noise,
/// where forty numbers a tick are wanted and the far tails are not.
inline double rough_normal_of(std::uint32_t word) noexcept {
  const std::uint32_t pairs = (word & 0x00ff00ffU) + ((word >> 8U) & 0x00ff00ffU);
  const auto sum = static_cast<int>((pairs & 0xffffU) + (pairs >> 16U));
  return (sum - 510) * 0.0067658751;  // 1 / sqrt(4 (256^2 - 1) / 12)
}

}  // namespace pastern::stub
