// What the watches found in one tick: the first cause with its numbers, and the set of all.
#pragma once

#include <cstdint>

#include "safety/trip.h"

namespace pastern::safety {

using CauseSet = std::uint32_t;
static_assert(kCauseCount <= 32, "a CauseSet holds one bit a cause");

[[nodiscard]] constexpr CauseSet bit(Cause cause) noexcept {
  return CauseSet{1} << static_cast<unsigned>(cause);
}

class Findings {
 public:
  /// `held_s`: how long it had lasted. The first note of a tick is kept whole, later ones join the set.
  void note(Cause cause, int joint, double value, double limit, double held_s = 0.0) noexcept;
  void note(Cause cause) noexcept { note(cause, -1, 0.0, 0.0); }

  [[nodiscard]] bool any() const noexcept { return all_ != 0; }
  [[nodiscard]] CauseSet all() const noexcept { return all_; }
  /// Cause, joint, value, limit and held_s; tick, time and reaction are the gate's to fill in.
  [[nodiscard]] const Trip& first() const noexcept { return first_; }

 private:
  Trip first_;
  CauseSet all_{0};
};

}  // namespace pastern::safety
