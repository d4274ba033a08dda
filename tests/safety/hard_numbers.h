// Numbers that are hard on comparisons, drawn by a fixed seed: not finite, denormal, huge, and on, just below
// and just above a limit.
#pragma once

#include <array>
#include <bit>
#include <cmath>
#include <cstdint>
#include <limits>
#include <random>

namespace pastern::safety::test {

class Dice {
 public:
  explicit Dice(std::uint64_t seed) : random_(seed) {}

  std::uint64_t bits() { return random_(); }
  bool one_in(std::uint64_t n) { return random_() % n == 0; }
  int below(int n) { return static_cast<int>(random_() % static_cast<std::uint64_t>(n)); }
  double between(double low, double high) {
    return low + (high - low) * (static_cast<double>(random_() >> 11) * 0x1p-53);
  }
  /// `near`: what the number is about (a value or a limit).
  double hard(double near) {
    using Of = std::numeric_limits<double>;
    const std::array<double, 18> numbers{
        Of::quiet_NaN(),
        Of::infinity(),
        -Of::infinity(),
        Of::max(),
        Of::lowest(),
        Of::denorm_min(),
        -Of::denorm_min(),
        Of::min(),
        0.0,
        -0.0,
        near,
        -near,
        std::nextafter(near, Of::infinity()),
        std::nextafter(near, -Of::infinity()),
        10 * near,
        1e9 * near,
        std::bit_cast<double>(random_()),
        std::bit_cast<double>(std::bit_cast<std::uint64_t>(near) ^ (std::uint64_t{1} << (random_() % 64)))};
    return numbers[static_cast<std::size_t>(random_() % numbers.size())];
  }

 private:
  std::mt19937_64 random_;
};

}  // namespace pastern::safety::test
