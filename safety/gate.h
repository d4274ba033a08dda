// The gate: the last word on every drive command. Judges the raw sensor frame, never an estimate.
// Not a certified safety function. Cycle thread only. No heap, locks, exceptions, virtual calls or recursion.
//
// Holds in every phase, for any input, NaN included: each torque is finite, within +-peak_torque_nm, and
// within slew_nm_per_s * tick of the tick before (zero when torque was off); entries from joint_count on are
// zero. Taking the torque off is always allowed at once.
//
// What is judged when
//   always: emergency stop, halt, stop, internal stop, bus error, frame (finite, possible, stale, frozen),
//     winding temperature, thermal model, pack;
//   while torque is wanted and not latched off: tilt, body rate, joint angle, speed, torque, jumps, stuck
//     encoders, baton, overrun: a parked robot may be carried, laid on its side, and nobody need hold it;
//   while armed as well: torque and target finite, base low (in a ramp-down the trunk is meant to sink).
#pragma once

#include <array>
#include <cstdint>

#include "safety/body_watch.h"
#include "safety/findings.h"
#include "safety/frame_watch.h"
#include "safety/frames.h"
#include "safety/joint_watch.h"
#include "safety/limits.h"
#include "safety/stop_sequence.h"
#include "safety/thermal.h"
#include "safety/timing.h"
#include "safety/trip.h"

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
  bool torque_wanted{false};  ///< false: parked, the command is torque off; no trip by itself
};

class Gate {
 public:
  explicit Gate(const Limits& limits) noexcept;

  /// One tick. `wanted` and `target` come from the PD stage and may hold anything, NaN included.
  /// `late_s`: by how much this tick began after it was due. Returns the only command that may reach the
  /// drives.
  ///
  /// A trip latches its first cause. Reaction ramp_down: damp, lower, torque off within damp_s + lower_s; a
  /// cause that asks for torque_off while that runs takes the torque off at once, the recorded cause stays.
  /// A ramp-down needs joint speeds: where they cannot be trusted (not finite, impossible, stale, frozen, bus
  /// error), and where torque was off anyway, it becomes torque off. operator_halt and emergency_stop always
  /// take the torque off, whatever the robot file says.
  [[nodiscard]] DriveCommand judge(const SensorFrame& frame, const Torques<>& wanted,
                                   const JointAngles<>& target, const Flags& flags, TimeNs now,
                                   double late_s) noexcept;

  [[nodiscard]] Phase phase() const noexcept { return stop_.phase(); }
  /// First cause since the last release; cause none when armed.
  [[nodiscard]] const Trip& trip() const noexcept { return trip_; }
  /// Of the last judged frame. pack_floor before the first, for nothing is known of the pack.
  [[nodiscard]] Hold hold() const noexcept;
  /// Clears a trip: only when the torque is off, nothing that is judged always was present in the last tick,
  /// and that tick no longer wanted torque (releasing only permits a start, it must not cause one: ISO
  /// 13850). An operator's act; false when refused.
  [[nodiscard]] bool release() noexcept;
  /// True when the last judge changed a wanted torque (peak, slew, fades).
  [[nodiscard]] bool clamped() const noexcept { return clamped_; }
  /// The gate's own roll and pitch, rad. Upside down until the first frame.
  [[nodiscard]] double roll_rad() const noexcept { return body_.tilt().roll(); }
  [[nodiscard]] double pitch_rad() const noexcept { return body_.tilt().pitch(); }
  /// Hottest joint of the thermal model, 1 = limit.
  [[nodiscard]] double thermal_worst() const noexcept { return thermal_.worst(joints_); }
  /// Thermal state to carry over a restart (thermal memory must not be zeroed by a power cut).
  /// Entries are fractions of the limit.
  [[nodiscard]] const PerJoint<Celsius>& thermal_state() const noexcept { return thermal_.state(); }
  void restore_thermal_state(const PerJoint<Celsius>& state) noexcept { thermal_.restore(state); }
  /// The simulated or carried robot was set down elsewhere: tilt, frame memory and hold times start anew;
  /// trip, heat and pack stay.
  void reset_filters() noexcept;

 private:
  struct Envelope {
    double peak;
    double step;
  };

  void look(const SensorFrame& frame, const Flags& flags, std::int64_t elapsed, Findings& found) noexcept;
  void heat(const SensorFrame& frame, std::int64_t elapsed, Findings& found) noexcept;
  void look_at_command(const Torques<>& wanted, const JointAngles<>& target, Findings& found) const noexcept;
  void react(const Findings& found, const Flags& flags, TimeNs now) noexcept;
  void keep_for_hold(const SensorFrame& frame) noexcept;
  [[nodiscard]] double desired(const SensorFrame& frame, const Torques<>& wanted, int joint) const noexcept;
  [[nodiscard]] DriveCommand command(const SensorFrame& frame, const Torques<>& wanted,
                                     const Flags& flags) noexcept;
  [[nodiscard]] bool live(const Flags& flags) const noexcept {
    return flags.torque_wanted && phase() != Phase::off;
  }

  Limits limits_;
  int joints_;
  double tick_s_;
  std::array<Envelope, kMaxJoints> envelope_{};
  CauseSet at_once_;
  TickCounter ticks_;
  FrameWatch frame_;
  BodyWatch body_;
  JointWatch joint_;
  PackWatch pack_;
  ThermalModel thermal_;
  StopSequence stop_;
  Trip trip_;
  Torques<> last_;  ///< torque of the last command; zero when it was off
  std::uint64_t tick_{0};
  CauseSet blocking_{0};
  bool powered_{false};
  bool wanted_{false};
  bool clamped_{false};
  bool winding_warm_{false};
  bool pack_floor_{true};
};

}  // namespace pastern::safety
