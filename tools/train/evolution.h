// Antithetic evolution strategies (arXiv:1910.01215; Salimans et al., arXiv:1703.03864 for ranks and mirrored
// sampling) with Adam (arXiv:1412.6980). Maximises. Pure arithmetic: what is evaluated, and where, is the
// caller's.
#pragma once

#include <cstdint>
#include <vector>

#include "runtime/types/parameters.h"

namespace pastern::tools {

/// The i-th direction of an iteration: independent standard normals, a function of (seed, iteration, i)
/// alone.
void draw_direction(std::uint64_t seed, std::uint32_t iteration, std::size_t i, Parameters& direction);

/// Weights of directions from the differences of their pairs, f(x + sigma g) - f(x - sigma g): rank of
/// |difference|, 1 for the largest down to 1/n, with the difference's sign; equal sizes share the mean of
/// their ranks; zero and NaN weigh nothing. Invariant under any odd monotone change of the differences, hence
/// untouched by one fall that costs ten times the rest.
[[nodiscard]] std::vector<double> rank_weights(const std::vector<double>& differences);

/// Adam with bias correction (arXiv:1412.6980, algorithm 1), ascending.
struct Adam {
  Parameters mean;
  Parameters square;
  std::uint32_t steps{0};

  static constexpr double kMeanDecay = 0.9;
  static constexpr double kSquareDecay = 0.999;
  static constexpr double kTiny = 1e-8;

  /// x += step * m^ / (sqrt(v^) + tiny). Sizes equal; empty moments are zero moments.
  void ascend(const Parameters& gradient, double step, Parameters& x);
};

/// gradient[j] = 1/n sum over i, in the order of i, of weights[i] * directions[i][j]: the same bits whoever
/// evaluated what.
[[nodiscard]] Parameters gradient_of(const std::vector<double>& weights,
                                     const std::vector<Parameters>& directions);

}  // namespace pastern::tools
