// Percentiles of a list of durations, for benches.
#pragma once

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <string>
#include <vector>

namespace pastern::bench {

/// The smallest sample with at least `share` of all at or below it (nearest rank). 0 when there are none.
inline double percentile(std::vector<double> samples, double share) {
  if (samples.empty()) return 0.0;
  const auto rank = static_cast<std::size_t>(std::ceil(share * static_cast<double>(samples.size())));
  const std::size_t index = rank == 0 ? 0 : rank - 1;
  std::nth_element(samples.begin(), samples.begin() + static_cast<std::ptrdiff_t>(index), samples.end());
  return samples[index];
}

}  // namespace pastern::bench
