// Time inside the gate, counted in whole ticks: how many have gone by, and how long a condition has lasted.
// Counting keeps hold times exact to the tick and lets a stalled cycle count the ticks that it missed.
#pragma once

#include <cstdint>

#include "safety/units.h"

namespace pastern::safety {

inline constexpr std::int64_t kLongestTicks = 1'000'000'000;

/// The tick period, or 1 ms when the given one makes no sense (a checked robot file never gives such).
[[nodiscard]] double sound_tick_s(double tick_s) noexcept;

/// Ticks after which a hold time is reached: rounded up. NaN and negative: 0, that is at once.
[[nodiscard]] std::int64_t hold_ticks(double hold_s, double tick_s) noexcept;

/// Whole ticks inside a span: rounded down. NaN and negative: 0.
[[nodiscard]] std::int64_t ticks_within(double span_s, double tick_s) noexcept;

/// Counts whole ticks between calls, against one origin, so that jitter of the calls does not add up.
class TickCounter {
 public:
  explicit TickCounter(double tick_s) noexcept;
  /// At least 1. A clock that stands still or goes back counts one tick a call.
  [[nodiscard]] std::int64_t advance(TimeNs now) noexcept;
  void reset() noexcept { seen_ = false; }

 private:
  void anchor(TimeNs now) noexcept;

  std::uint64_t tick_ns_;
  TimeNs origin_;
  TimeNs last_;
  std::uint64_t counted_{0};  ///< since the origin
  bool seen_{false};
};

/// How long a condition has lasted without a break. The tick that first shows it counts 0.
class HoldClock {
 public:
  void look(bool present, std::int64_t elapsed) noexcept {
    if (!present) {
      held_ = -1;
    } else if (held_ < 0) {
      held_ = 0;
    } else if (held_ < kLongestTicks) {
      held_ += elapsed;
    }
  }
  [[nodiscard]] bool reached(std::int64_t ticks) const noexcept { return held_ >= 0 && held_ >= ticks; }
  [[nodiscard]] std::int64_t ticks() const noexcept { return held_ < 0 ? 0 : held_; }
  void reset() noexcept { held_ = -1; }

 private:
  std::int64_t held_{-1};
};

}  // namespace pastern::safety
