// Bookkeeping of a batch.
#include "runtime/adapt/told.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace pastern::adapt {

bool accept(const Evaluation& evaluation, std::uint32_t batch, Told& told) {
  if (evaluation.outcome == Outcome::voided || evaluation.batch != batch) return false;
  if (evaluation.index >= told.size() || told[evaluation.index].has_value()) return false;
  const double total = evaluation.terms.total();
  told[evaluation.index] = std::isfinite(total) ? total : -std::numeric_limits<double>::infinity();
  return true;
}

bool complete(const Told& told) {
  return std::all_of(told.begin(), told.end(), [](const auto& entry) { return entry.has_value(); });
}

}  // namespace pastern::adapt
