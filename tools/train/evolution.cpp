// Sums run in index order everywhere.
#include "tools/train/evolution.h"

#include <algorithm>
#include <cmath>
#include <numeric>

#include "tools/train/draws.h"

namespace pastern::tools {

void draw_direction(std::uint64_t seed, std::uint32_t iteration, std::size_t i, Parameters& direction) {
  Draws draws(seed, Purpose::direction, (static_cast<std::uint64_t>(iteration) << 32U) | i);
  for (double& value : direction) value = draws.normal();
}

std::vector<double> rank_weights(const std::vector<double>& differences) {
  const std::size_t n = differences.size();
  const auto size_of = [&](std::size_t i) {
    return std::isnan(differences[i]) ? 0.0 : std::abs(differences[i]);
  };
  std::vector<std::size_t> order(n);
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(),
                   [&](std::size_t a, std::size_t b) { return size_of(a) < size_of(b); });
  std::vector<double> weights(n, 0);
  for (std::size_t first = 0; first < n;) {
    std::size_t end = first + 1;
    while (end < n && size_of(order[end]) == size_of(order[first])) ++end;
    // Ranks first+1 .. end share their mean.
    const double rank = 0.5 * static_cast<double>(first + 1 + end) / static_cast<double>(n);
    for (std::size_t k = first; k < end; ++k) {
      const std::size_t i = order[k];
      if (size_of(i) > 0) weights[i] = std::copysign(rank, differences[i]);
    }
    first = end;
  }
  return weights;
}

void Adam::ascend(const Parameters& gradient, double step, Parameters& x) {
  mean.resize(x.size(), 0);
  square.resize(x.size(), 0);
  ++steps;
  const double mean_bias = 1 - std::pow(kMeanDecay, steps);
  const double square_bias = 1 - std::pow(kSquareDecay, steps);
  for (std::size_t j = 0; j < x.size(); ++j) {
    mean[j] = kMeanDecay * mean[j] + (1 - kMeanDecay) * gradient[j];
    square[j] = kSquareDecay * square[j] + (1 - kSquareDecay) * gradient[j] * gradient[j];
    x[j] += step * (mean[j] / mean_bias) / (std::sqrt(square[j] / square_bias) + kTiny);
  }
}

Parameters gradient_of(const std::vector<double>& weights, const std::vector<Parameters>& directions) {
  Parameters gradient(directions.empty() ? 0 : directions.front().size(), 0);
  for (std::size_t i = 0; i < directions.size(); ++i) {
    for (std::size_t j = 0; j < gradient.size(); ++j) gradient[j] += weights[i] * directions[i][j];
  }
  for (double& value : gradient) value /= static_cast<double>(std::max<std::size_t>(1, directions.size()));
  return gradient;
}

}  // namespace pastern::tools
