// Sign-flip test by halves: the 2^n sums are counted exactly from two sorted lists of 2^(n/2).
#include "runtime/adapt/confirm.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

#include "runtime/adapt/random.h"

namespace pastern::adapt {
namespace {

constexpr std::size_t kMostPairs = 24;
constexpr double kTieTolerance = 1e-12;

// Sums of all subsets of values[first, last), sorted.
std::vector<double> subset_sums(const std::vector<double>& values, std::size_t first, std::size_t last) {
  std::vector<double> sums{0.0};
  for (std::size_t i = first; i < last; ++i) {
    const std::size_t count = sums.size();
    for (std::size_t j = 0; j < count; ++j) sums.push_back(sums[j] + values[i]);
  }
  std::sort(sums.begin(), sums.end());
  return sums;
}

// Flipping the signs of a subset changes the sum by -2 times the subset's sum: the flipped sum is at least
// the observed one exactly when the subset's sum is at most zero. Counts those subsets, the empty one
// included.
double subsets_not_above_zero(const std::vector<double>& values) {
  double magnitude = 0;
  for (const double value : values) magnitude += std::abs(value);
  const double tie = kTieTolerance * magnitude;
  const std::size_t half = values.size() / 2;
  const std::vector<double> left = subset_sums(values, 0, half);
  const std::vector<double> right = subset_sums(values, half, values.size());
  double count = 0;
  std::size_t fitting = right.size();
  for (const double sum : left) {
    while (fitting > 0 && sum + right[fitting - 1] > tie) --fitting;
    count += static_cast<double>(fitting);
  }
  return count;
}

bool testable(const std::vector<double>& differences) {
  return !differences.empty() &&
         std::all_of(differences.begin(), differences.end(), [](double d) { return std::isfinite(d); });
}

std::vector<double> shifted(const std::vector<double>& differences, double shift, double sign) {
  std::vector<double> result;
  result.reserve(differences.size());
  for (const double d : differences) result.push_back(sign * (d - shift));
  return result;
}

// Least shift that the one-sided test on sign * (differences - shift) does not reject at 1 in 2^n / rejected.
// The count rises with the shift in steps (at the means of subsets; Hartigan, J. Am. Stat. Assoc. 64, 1969).
double least_kept(const std::vector<double>& differences, double rejected, double sign) {
  std::vector<double> signed_differences = shifted(differences, 0.0, sign);
  const auto [least, most] = std::minmax_element(signed_differences.begin(), signed_differences.end());
  double low = *least;
  double high = *most;
  const auto kept = [&](double shift) {
    return subsets_not_above_zero(shifted(signed_differences, shift, 1.0)) > rejected;
  };
  if (kept(low)) return low;
  while (true) {
    const double middle = low + (high - low) / 2;
    if (!(middle > low && middle < high)) return high;
    (kept(middle) ? high : low) = middle;
  }
}

}  // namespace

double sign_flip_p(const std::vector<double>& differences) {
  if (differences.size() > kMostPairs) throw std::invalid_argument("sign-flip test: at most 24 differences");
  if (!testable(differences)) return 1.0;
  return subsets_not_above_zero(differences) / std::ldexp(1.0, static_cast<int>(differences.size()));
}

Interval sign_flip_interval(const std::vector<double>& differences, double level) {
  if (differences.size() > kMostPairs)
    throw std::invalid_argument("sign-flip interval: at most 24 differences");
  if (!(level > 0 && level < 1)) throw std::invalid_argument("sign-flip interval: level is between 0 and 1");
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  if (!testable(differences)) return {-kInfinity, kInfinity};
  // One side rejects a shift when its count is at most this many of the 2^n patterns.
  const double patterns = std::ldexp(1.0, static_cast<int>(differences.size()));
  const double rejected = std::floor((1.0 - level) / 2 * patterns * (1 + 1e-12));
  if (rejected < 1) return {-kInfinity, kInfinity};  // too few pairs: nothing can be rejected
  return {least_kept(differences, rejected, 1.0), -least_kept(differences, rejected, -1.0)};
}

bool adapted_walks_first(std::uint64_t seed, std::uint32_t pair) {
  return (random_bits(seed, Stream::confirmation_order, pair, 0) & 1U) != 0;
}

}  // namespace pastern::adapt
