// Watches of the body: roll and pitch by the gate's own filter, body rate, trunk height; and of the pack.
#pragma once

#include <cstdint>

#include "safety/findings.h"
#include "safety/frames.h"
#include "safety/limits.h"
#include "safety/tilt.h"
#include "safety/timing.h"

namespace pastern::safety {

class BodyWatch {
 public:
  explicit BodyWatch(const Limits& limits) noexcept;

  /// Feeds the tilt filter with a fresh frame, `span_ticks` after the last one. Also while parked.
  void follow(const Limits& limits, const SensorFrame& frame, std::int64_t span_ticks) noexcept;
  /// `live`: torque is on or about to be; a parked robot may be carried or laid on its side.
  /// `watch_base`: the trunk is meant to be up.
  void look(const Limits& limits, const SensorFrame& frame, bool live, bool watch_base, std::int64_t elapsed,
            Findings& found) noexcept;
  /// Forgets tilt and how long things had lasted.
  void reset() noexcept;

  [[nodiscard]] const TiltFilter& tilt() const noexcept { return tilt_; }

 private:
  void look_at_tilt(const Limits& limits, bool live, std::int64_t elapsed, Findings& found) noexcept;
  void look_at_angle(const Limits& limits, Cause cause, double angle, HoldClock& clock,
                     Findings& found) const noexcept;
  void look_at_rate(const Limits& limits, const SensorFrame& frame, bool live, std::int64_t elapsed,
                    Findings& found) noexcept;
  void look_at_height(const Limits& limits, const SensorFrame& frame, bool watched, std::int64_t elapsed,
                      Findings& found) noexcept;

  double tick_s_;
  std::int64_t tilt_hold_;
  std::int64_t rate_hold_;
  std::int64_t base_hold_;
  TiltFilter tilt_;
  HoldClock roll_beyond_;
  HoldClock pitch_beyond_;
  HoldClock rate_beyond_;
  HoldClock base_low_;
};

/// Voltage below its limit and current (either direction) beyond its limit, both with the pack's hold time.
class PackWatch {
 public:
  explicit PackWatch(const Limits& limits) noexcept;
  void look(const Limits& limits, const SensorFrame& frame, std::int64_t elapsed, Findings& found) noexcept;

 private:
  double tick_s_;
  std::int64_t hold_;
  HoldClock low_;
  HoldClock high_;
};

}  // namespace pastern::safety
