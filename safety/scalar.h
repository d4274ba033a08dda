// What a scalar must offer to the pure functions of clamps.h: + - * /, comparisons, select() and abs(), found
// by argument-dependent lookup. A scalar that holds many numbers brings its own select over a mask.
#pragma once

namespace pastern::safety {

/// `a` where the condition holds, else `b`. A comparison with NaN does not hold.
[[nodiscard]] constexpr double select(bool condition, double a, double b) noexcept {
  return condition ? a : b;
}

}  // namespace pastern::safety
