// Comparisons hold for the safe side only, so NaN is always found.
#include "safety/body_watch.h"

#include <cmath>

#include "safety/base_height.h"

namespace pastern::safety {

BodyWatch::BodyWatch(const Limits& limits) noexcept
    : tick_s_(sound_tick_s(limits.tick_s)),
      tilt_hold_(hold_ticks(limits.tilt_hold_s, tick_s_)),
      rate_hold_(hold_ticks(limits.body_rate_hold_s, tick_s_)),
      base_hold_(hold_ticks(limits.base_low_hold_s, tick_s_)) {}

void BodyWatch::reset() noexcept {
  tilt_.reset();
  roll_beyond_.reset();
  pitch_beyond_.reset();
  rate_beyond_.reset();
  base_low_.reset();
}

void BodyWatch::follow(const Limits& limits, const SensorFrame& frame, std::int64_t span_ticks) noexcept {
  tilt_.follow(frame.rate, frame.acceleration, static_cast<double>(span_ticks) * tick_s_,
               limits.tilt_filter_s);
}

void BodyWatch::look(const Limits& limits, const SensorFrame& frame, bool live, bool watch_base,
                     std::int64_t elapsed, Findings& found) noexcept {
  look_at_tilt(limits, live, elapsed, found);
  look_at_rate(limits, frame, live, elapsed, found);
  look_at_height(limits, frame, live && watch_base, elapsed, found);
}

void BodyWatch::look_at_tilt(const Limits& limits, bool live, std::int64_t elapsed,
                             Findings& found) noexcept {
  const double roll = tilt_.roll();
  const double pitch = tilt_.pitch();
  roll_beyond_.look(live && !(std::fabs(roll) <= limits.tilt_rad), elapsed);
  pitch_beyond_.look(live && !(std::fabs(pitch) <= limits.tilt_rad), elapsed);
  if (!live) return;
  look_at_angle(limits, Cause::roll, roll, roll_beyond_, found);
  look_at_angle(limits, Cause::pitch, pitch, pitch_beyond_, found);
}

void BodyWatch::look_at_angle(const Limits& limits, Cause cause, double angle, HoldClock& clock,
                              Findings& found) const noexcept {
  const double held_s = static_cast<double>(clock.ticks()) * tick_s_;
  if (!(std::fabs(angle) <= limits.tilt_at_once_rad)) {
    found.note(cause, -1, angle, limits.tilt_at_once_rad, held_s);
  } else if (clock.reached(tilt_hold_)) {
    found.note(cause, -1, angle, limits.tilt_rad, held_s);
  }
}

void BodyWatch::look_at_rate(const Limits& limits, const SensorFrame& frame, bool live, std::int64_t elapsed,
                             Findings& found) noexcept {
  const auto& w = frame.rate;
  const double size = std::sqrt(w.x * w.x + w.y * w.y + w.z * w.z);
  rate_beyond_.look(live && !(size <= limits.body_rate_rad_per_s), elapsed);
  if (rate_beyond_.reached(rate_hold_)) {
    found.note(Cause::body_rate, -1, size, limits.body_rate_rad_per_s,
               static_cast<double>(rate_beyond_.ticks()) * tick_s_);
  }
}

void BodyWatch::look_at_height(const Limits& limits, const SensorFrame& frame, bool watched,
                               std::int64_t elapsed, Findings& found) noexcept {
  const double height = watched ? base_height(limits, frame.angle, tilt_.up()) : 0.0;
  base_low_.look(watched && !(height >= limits.base_low_m), elapsed);
  if (base_low_.reached(base_hold_)) {
    found.note(Cause::base_low, -1, height, limits.base_low_m,
               static_cast<double>(base_low_.ticks()) * tick_s_);
  }
}

PackWatch::PackWatch(const Limits& limits) noexcept
    : tick_s_(sound_tick_s(limits.tick_s)), hold_(hold_ticks(limits.pack_hold_s, tick_s_)) {}

void PackWatch::look(const Limits& limits, const SensorFrame& frame, std::int64_t elapsed,
                     Findings& found) noexcept {
  const double voltage = frame.pack_voltage_v;
  const double current = frame.pack_current_a;
  low_.look(!(voltage >= limits.pack_low_v), elapsed);
  high_.look(!(std::fabs(current) <= limits.pack_current_max_a), elapsed);
  if (low_.reached(hold_)) {
    found.note(Cause::pack_voltage_low, -1, voltage, limits.pack_low_v,
               static_cast<double>(low_.ticks()) * tick_s_);
  }
  if (high_.reached(hold_)) {
    found.note(Cause::pack_current_high, -1, current, limits.pack_current_max_a,
               static_cast<double>(high_.ticks()) * tick_s_);
  }
}

}  // namespace pastern::safety
