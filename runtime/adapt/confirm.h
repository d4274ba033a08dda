// The exact one-sided sign-flip test on paired differences (Fisher 1935, sec. 21), and the interval that
// belongs to it.
#pragma once

#include <cstdint>
#include <vector>

namespace pastern::adapt {

/// Share of the 2^n sign patterns whose sum of differences is at least the observed one (ties count, compared
/// with a tolerance of 1e-12 of the sum of magnitudes). n in 1..24, more throws std::invalid_argument; 1.0
/// when any difference is not finite or n is 0. Cost: two sorts of 2^(n/2) numbers.
[[nodiscard]] double sign_flip_p(const std::vector<double>& differences);

struct Interval {
  double low{0};
  double high{0};
};
/// All shifts d that a two-sided sign-flip test at 1 - level does not reject, on differences - d (test
/// inversion). Each side gets half of 1 - level, so the interval at 0.9 belongs to the one-sided test at 5 %.
/// Infinite on both sides when there are too few pairs for the level (under 5 at 0.9, under 6 at 0.95) or a
/// difference is not finite.
[[nodiscard]] Interval sign_flip_interval(const std::vector<double>& differences, double level);

/// For each pair whether the adapted policy walks first: random, a pure function of the seed.
[[nodiscard]] bool adapted_walks_first(std::uint64_t seed, std::uint32_t pair);

}  // namespace pastern::adapt
