// Keeps the first finding of a tick, with numbers that any file or message can hold.
#include "safety/findings.h"

#include <cmath>
#include <limits>

namespace pastern::safety {
namespace {

double storable(double x) noexcept {
  if (std::isfinite(x)) return x;
  if (std::isnan(x)) return 0.0;
  return x > 0.0 ? std::numeric_limits<double>::max() : std::numeric_limits<double>::lowest();
}

}  // namespace

void Findings::note(Cause cause, int joint, double value, double limit, double held_s) noexcept {
  if (!any()) {
    first_.cause = cause;
    first_.joint = joint;
    first_.value = storable(value);
    first_.limit = storable(limit);
    first_.held_s = storable(held_s);
  }
  all_ |= bit(cause);
}

}  // namespace pastern::safety
