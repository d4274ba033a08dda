// The stop sequence. SS1 in meaning (IEC 61800-5-2; stop category 1 of IEC 60204-1): damp, lower, then torque
// off within a stated time even if the robot still moves. STO in meaning (category 0): torque off at once.
#pragma once

#include <cstdint>

#include "safety/trip.h"

namespace pastern::safety {

class StopSequence {
 public:
  /// Whole ticks of each phase, rounded down so that the stated time is never exceeded.
  StopSequence(std::int64_t damp_ticks, std::int64_t lower_ticks) noexcept;

  /// From armed. `at_once`: straight to off.
  void begin(bool at_once) noexcept;
  /// Torque off now; the phase stays off until rearm().
  void cut() noexcept { phase_ = Phase::off; }
  void advance(std::int64_t elapsed) noexcept;
  void rearm() noexcept { phase_ = Phase::armed; }

  [[nodiscard]] Phase phase() const noexcept { return phase_; }
  /// Share of the joints' full damping: 1 while damping; while lowering it fades linearly to 0, so that the
  /// trunk sinks by its own weight and no torque is left to cut off at the end.
  [[nodiscard]] double damping_share() const noexcept;

 private:
  void settle() noexcept;

  std::int64_t damp_ticks_;
  std::int64_t lower_ticks_;
  std::int64_t ran_{0};
  Phase phase_{Phase::armed};
};

}  // namespace pastern::safety
