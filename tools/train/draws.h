// Counter-based random numbers of training: Philox4x32-10 of Random123 (Salmon et al., "Parallel random
// numbers: as easy as 1, 2, 3", SC 2011). A number is a pure function of (seed, purpose, index, place), so
// that threads do not matter.
#pragma once

#include <array>
#include <cstdint>

namespace pastern::tools {

/// Purposes, so that one set of coordinates never serves two.
enum class Purpose : std::uint32_t { direction = 1, site = 2, walk = 3, look = 4, oracle = 5 };

/// A stream of numbers that begins at place 0. Plain value.
class Draws {
 public:
  Draws(std::uint64_t seed, Purpose purpose, std::uint64_t index) noexcept;

  [[nodiscard]] std::uint32_t word() noexcept;
  [[nodiscard]] std::uint64_t word64() noexcept;
  /// In (0, 1).
  [[nodiscard]] double uniform() noexcept;
  [[nodiscard]] double between(double low, double high) noexcept { return low + (high - low) * uniform(); }
  /// Standard normal by Box and Muller (Ann. Math. Stat. 29(2), 1958).
  [[nodiscard]] double normal() noexcept;

 private:
  std::array<std::uint32_t, 2> key_;
  std::array<std::uint32_t, 4> counter_;
  std::array<std::uint32_t, 4> words_{};
  unsigned left_{0};
};

}  // namespace pastern::tools
