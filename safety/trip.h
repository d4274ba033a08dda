// What a trip is, and the states that the gate can be in. Plain values.
#pragma once

#include <cstdint>

#include "safety/limits.h"
#include "safety/units.h"

namespace pastern::safety {

/// The recorded cause of a stop. Numbers are always finite: what was not a number is written as 0, infinity
/// as the largest number.
struct Trip {
  Cause cause{Cause::none};
  std::int32_t joint{-1};  ///< -1 when it is not a joint's
  double value{0};         ///< in unit(cause)
  double limit{0};
  double held_s{0};       ///< how long the condition had lasted
  std::uint64_t tick{0};  ///< as in DriveCommand::tick()
  TimeNs time;
  /// What was done: ramp_down becomes torque_off when a harder cause cut the ramp-down short.
  Reaction reaction{Reaction::torque_off};
};

enum class Phase : std::uint8_t { armed = 0, damping, lowering, off };  ///< off: torque off, latched

/// Why no new episode may begin although nothing has tripped.
enum class Hold : std::uint8_t { none = 0, winding_warm, thermal_model, pack_floor, tripped };

/// Name as written in robot files and journals ("operator_stop"), unit ("N m"), both for people too.
[[nodiscard]] const char* name(Cause cause) noexcept;
[[nodiscard]] const char* unit(Cause cause) noexcept;
[[nodiscard]] const char* name(Reaction reaction) noexcept;
[[nodiscard]] const char* name(Phase phase) noexcept;
[[nodiscard]] const char* name(Hold hold) noexcept;

}  // namespace pastern::safety
