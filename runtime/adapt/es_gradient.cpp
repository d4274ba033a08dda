// Antithetic ES gradient with robustly normalised steps.
#include "runtime/adapt/es_gradient.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <stdexcept>

namespace pastern::adapt {
namespace {

// A difference beyond this many medians is clipped: for normal noise 3 medians of |d| are two standard
// deviations, so only falls and the like are touched.
constexpr double kClip = 3.0;

double difference(double plus, double minus) {
  if (std::isinf(plus) && std::isinf(minus)) return 0.0;  // both the worst: the pair says nothing
  return plus - minus;
}

// Median (lower of the middle two) of the magnitudes that are not zero, the infinite ones counted; the
// largest finite one when it is infinite itself; 0 when there is none.
double median_magnitude(const std::vector<double>& differences) {
  std::vector<double> magnitudes;
  for (const double d : differences)
    if (d != 0) magnitudes.push_back(std::abs(d));
  if (magnitudes.empty()) return 0.0;
  std::sort(magnitudes.begin(), magnitudes.end());
  std::size_t middle = (magnitudes.size() - 1) / 2;
  while (middle > 0 && std::isinf(magnitudes[middle])) --middle;
  return std::isinf(magnitudes[middle]) ? 0.0 : magnitudes[middle];
}

}  // namespace

std::vector<double> normalised_differences(const std::vector<double>& differences) {
  const double median = median_magnitude(differences);
  const double most = median > 0 ? std::min(kClip * median, std::numeric_limits<double>::max()) : 1.0;
  std::vector<double> clipped;
  double sum_of_squares = 0;
  for (const double d : differences) {
    // In units of `most`: neither the square of a huge difference overflows nor that of a tiny one vanishes.
    const double unit = std::clamp(d / most, -1.0, 1.0);
    clipped.push_back(unit);
    sum_of_squares += unit * unit;
  }
  if (!(sum_of_squares > 0)) return std::vector<double>(differences.size(), 0.0);
  const double spread = std::sqrt(sum_of_squares / static_cast<double>(clipped.size()));
  for (double& d : clipped) d /= spread;
  return clipped;
}

Parameters antithetic_gradient(const std::vector<double>& differences,
                               const std::vector<Parameters>& directions, double sigma) {
  Parameters gradient(directions.empty() ? 0 : directions.front().size(), 0.0);
  for (std::size_t pair = 0; pair < directions.size(); ++pair)
    for (std::size_t i = 0; i < gradient.size(); ++i)
      gradient[i] +=
          differences[pair] * directions[pair][i] / (2 * sigma * static_cast<double>(directions.size()));
  return gradient;
}

EsGradient::EsGradient(const Settings& settings, const Parameters& start)
    : region_(settings, start),
      pairs_(settings.batch),
      step_(settings.step == 0 ? kDefaultStep : settings.step),
      centre_(start) {
  if (pairs_ == 0) throw std::invalid_argument("adaptation: batch is 0, expected at least 1 pair");
  if (!(step_ > 0) || !std::isfinite(step_))
    throw std::invalid_argument("adaptation: step is not a positive number");
  propose();
}

void EsGradient::propose() {
  batch_.clear();
  for (std::size_t pair = 0; pair < pairs_; ++pair) {
    for (const double sign : {1.0, -1.0})
      batch_.push_back({number_, static_cast<std::uint32_t>(batch_.size()),
                        region_.perturbed(centre_, sign, number_, static_cast<std::uint32_t>(pair))});
  }
  told_.assign(batch_.size(), std::nullopt);
}

bool EsGradient::observe(const Committed<Evaluation>& evaluation) {
  if (!accept(evaluation.value(), number_, told_)) return false;
  if (!complete(told_)) return false;
  move();
  ++number_;
  propose();
  return true;
}

void EsGradient::move() {
  std::vector<double> differences;
  std::vector<Parameters> directions;  // sigma g, as walked
  for (std::size_t pair = 0; pair < pairs_; ++pair) {
    const Parameters& plus = batch_[2 * pair].parameters;
    const Parameters& minus = batch_[2 * pair + 1].parameters;
    differences.push_back(difference(*told_[2 * pair], *told_[2 * pair + 1]));
    Parameters direction(plus.size());
    for (std::size_t i = 0; i < plus.size(); ++i) direction[i] = (plus[i] - minus[i]) / 2;
    directions.push_back(std::move(direction));
  }
  const Parameters mean = antithetic_gradient(normalised_differences(differences), directions, 0.5);
  Parameters next = centre_;
  for (std::size_t i = 0; i < next.size(); ++i) next[i] += step_ * mean[i];
  centre_ = region_.shrunk(std::move(next));
}

std::string EsGradient::name() const { return "antithetic ES gradient (arXiv:1910.01215)"; }

}  // namespace pastern::adapt
