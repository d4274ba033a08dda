// Counts the ticks of a stop; a missed tick counts as well, so the deadline holds when the cycle stalls.
#include "safety/stop_sequence.h"

#include "safety/timing.h"

namespace pastern::safety {

StopSequence::StopSequence(std::int64_t damp_ticks, std::int64_t lower_ticks) noexcept
    : damp_ticks_(damp_ticks), lower_ticks_(lower_ticks) {}

void StopSequence::begin(bool at_once) noexcept {
  ran_ = 0;
  phase_ = at_once ? Phase::off : Phase::damping;
  settle();
}

void StopSequence::advance(std::int64_t elapsed) noexcept {
  if (ran_ < kLongestTicks) ran_ += elapsed;
  settle();
}

void StopSequence::settle() noexcept {
  if (phase_ != Phase::damping && phase_ != Phase::lowering) return;
  if (ran_ >= damp_ticks_ + lower_ticks_) {
    phase_ = Phase::off;
  } else if (ran_ >= damp_ticks_) {
    phase_ = Phase::lowering;
  }
}

double StopSequence::damping_share() const noexcept {
  if (phase_ == Phase::damping) return 1.0;
  if (phase_ != Phase::lowering) return 0.0;
  return static_cast<double>(damp_ticks_ + lower_ticks_ - ran_) / static_cast<double>(lower_ticks_);
}

}  // namespace pastern::safety
