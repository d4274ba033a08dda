// Watches of each joint: measured torque (with hold), hard edges of angle and speed, winding temperature.
#pragma once

#include <array>
#include <cstdint>

#include "safety/findings.h"
#include "safety/frames.h"
#include "safety/limits.h"
#include "safety/timing.h"

namespace pastern::safety {

class JointWatch {
 public:
  explicit JointWatch(const Limits& limits) noexcept;

  /// `live`: torque is on or about to be. Winding heat is judged always, the rest only while live: the limbs
  /// of a parked robot may be moved by hand.
  void look(const Limits& limits, const SensorFrame& frame, bool live, std::int64_t elapsed,
            Findings& found) noexcept;
  void reset() noexcept;

 private:
  std::array<std::int64_t, kMaxJoints> torque_hold_ticks_{};
  std::array<HoldClock, kMaxJoints> torque_high_{};
  double tick_s_;
};

}  // namespace pastern::safety
