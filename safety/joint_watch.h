// Watches of each joint: measured torque (with hold), hard edges of angle and speed, winding temperature.
#pragma once

#include <array>
#include <cstdint>

#include "safety/findings.h"
#include "safety/frames.h"
#include "safety/limits.h"
#include "safety/timing.h"

namespace pastern::safety {

/// A parked robot lies with its limbs against the end stops, about the edges of their range. A joint that is
/// found there when torque comes on may come in: until it has been clear of its soft edges once, its hard
/// edges count as farther out by the width of the soft edge (the gate lets no outward torque pass there, see
/// edge_fade). Farther out it trips.
class JointWatch {
 public:
  explicit JointWatch(const Limits& limits) noexcept;

  /// `live`: torque is on or about to be. Winding heat is judged always, the rest only while live: the limbs
  /// of a parked robot may be moved by hand.
  void look(const Limits& limits, const SensorFrame& frame, bool live, std::int64_t elapsed,
            Findings& found) noexcept;
  void reset() noexcept;

 private:
  void look_at_range(const JointLimits& limit, double angle, double speed, int joint,
                     Findings& found) noexcept;

  std::array<std::int64_t, kMaxJoints> torque_hold_ticks_{};
  std::array<HoldClock, kMaxJoints> torque_high_{};
  std::array<bool, kMaxJoints> been_clear_{};  ///< of its soft edges since torque was last wanted
  double tick_s_;
};

}  // namespace pastern::safety
