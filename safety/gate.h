// The gate: the last word on every drive command. Judges the raw sensor frame, never an estimate.
// Not a certified safety function. Cycle thread only. No heap, locks, exceptions, virtual calls or recursion.
#pragma once

#include <cstdint>

#include "safety/frames.h"
#include "safety/limits.h"

namespace pastern::safety {

/// What else reaches the gate in a tick; plain values copied from atomics by the cycle.
struct Flags {
  bool stop{false};  ///< operator's controlled stop
  bool halt{false};  ///< operator's torque off at once
  bool baton_lost{false};
  bool internal_stop{false};  ///< the program asks for an orderly stop
  bool bus_error{false};      ///< the drives could not be read or written
  bool frame_new{true};       ///< false: `frame` is the last one again
  bool watch_base{false};     ///< robot stands or walks: the base-low watch applies
  bool torque_wanted{false};  ///< false: parked, the command is torque off
};

struct Trip {
  Cause cause{Cause::none};
  std::int32_t joint{-1};  ///< -1 when it is not a joint's
  double value{0};
  double limit{0};
  double held_s{0};
  std::uint64_t tick{0};
  TimeNs time;
  Reaction reaction{Reaction::torque_off};
};

enum class Phase : std::uint8_t { armed = 0, damping, lowering, off };  ///< off: torque off, latched

/// Why no new episode may begin although nothing has tripped.
enum class Hold : std::uint8_t { none = 0, winding_warm, thermal_model, pack_floor, tripped };

/// Name as written in robot files and journals ("operator_stop"), unit ("N m"), both for people too.
[[nodiscard]] const char* name(Cause cause) noexcept;
[[nodiscard]] const char* unit(Cause cause) noexcept;
[[nodiscard]] const char* name(Reaction reaction) noexcept;

class Gate {
 public:
  explicit Gate(const Limits& limits) noexcept;

  /// One tick. `wanted` and `target` come from the PD stage and may hold anything, NaN included.
  /// `late_s`: by how much this tick began after it was due. Returns the only command that may reach the
  /// drives.
  [[nodiscard]] DriveCommand judge(const SensorFrame& frame, const Torques<>& wanted,
                                   const JointAngles<>& target, const Flags& flags, TimeNs now,
                                   double late_s) noexcept;

  [[nodiscard]] Phase phase() const noexcept;
  /// First cause since the last release; cause none when armed.
  [[nodiscard]] const Trip& trip() const noexcept;
  [[nodiscard]] Hold hold() const noexcept;
  /// Clears a trip: only when the torque is off and no cause is present any more. An operator's act; false
  /// when refused.
  [[nodiscard]] bool release() noexcept;
  /// True when the last judge changed a wanted torque (peak, slew, fades).
  [[nodiscard]] bool clamped() const noexcept;
  /// The gate's own roll and pitch, rad.
  [[nodiscard]] double roll_rad() const noexcept;
  [[nodiscard]] double pitch_rad() const noexcept;
  /// Hottest joint of the thermal model, 1 = limit.
  [[nodiscard]] double thermal_worst() const noexcept;
  /// Thermal state to carry over a restart (thermal memory must not be zeroed by a power cut).
  [[nodiscard]] const PerJoint<Celsius>& thermal_state()
      const noexcept;  ///< entries are fractions of the limit
  void restore_thermal_state(const PerJoint<Celsius>& state) noexcept;
  /// The simulated or carried robot was set down elsewhere: filters start anew, latches stay.
  void reset_filters() noexcept;

 private:
  // Owner of safety/ fills this in.
};

}  // namespace pastern::safety
