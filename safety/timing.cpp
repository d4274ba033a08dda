// Whole ticks from seconds and from a clock.
#include "safety/timing.h"

#include <cmath>

namespace pastern::safety {
namespace {

// A hold of 50 ms at 1 ms must be 50 ticks although 0.05 / 0.001 is not exactly 50 in binary.
constexpr double kRounding = 1e-6;

std::int64_t bounded(double ticks) noexcept {
  if (!(ticks > 0.0)) return 0;
  return ticks < static_cast<double>(kLongestTicks) ? static_cast<std::int64_t>(ticks) : kLongestTicks;
}

}  // namespace

double sound_tick_s(double tick_s) noexcept { return tick_s >= 1e-5 && tick_s <= 1.0 ? tick_s : 1e-3; }

std::int64_t hold_ticks(double hold_s, double tick_s) noexcept {
  const double ticks = hold_s / tick_s - kRounding;
  const std::int64_t whole = bounded(ticks);
  return static_cast<double>(whole) < ticks && whole < kLongestTicks ? whole + 1 : whole;
}

std::int64_t ticks_within(double span_s, double tick_s) noexcept {
  return bounded(span_s / tick_s + kRounding);
}

TickCounter::TickCounter(double tick_s) noexcept
    : tick_ns_(static_cast<std::uint64_t>(std::llround(sound_tick_s(tick_s) * 1e9))) {}

void TickCounter::anchor(TimeNs now) noexcept {
  origin_ = now;
  last_ = now;
  counted_ = 0;
  seen_ = true;
}

std::int64_t TickCounter::advance(TimeNs now) noexcept {
  if (!seen_ || now < last_) {
    anchor(now);
    return 1;
  }
  last_ = now;
  // Unsigned, so that clocks at the far ends of their range cannot overflow.
  const auto span = static_cast<std::uint64_t>(now.value) - static_cast<std::uint64_t>(origin_.value);
  const std::uint64_t total = span / tick_ns_ + (span % tick_ns_ >= tick_ns_ / 2 ? 1 : 0);
  const std::uint64_t elapsed = total > counted_ ? total - counted_ : 1;
  counted_ += elapsed;
  if (counted_ > total + 1) anchor(now);  // calls come faster than ticks: do not run ahead of the clock
  constexpr auto kMost = static_cast<std::uint64_t>(kLongestTicks);
  return static_cast<std::int64_t>(elapsed < kMost ? elapsed : kMost);
}

}  // namespace pastern::safety
