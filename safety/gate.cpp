// One tick of the gate: look, react, command. The envelope is put on at the very end, whatever came before.
#include "safety/gate.h"

#include <cmath>
#include <limits>

#include "safety/clamps.h"

namespace pastern::safety {
namespace {

constexpr CauseSet kAlwaysAtOnce = bit(Cause::operator_halt) | bit(Cause::emergency_stop);

/// Judged while torque is wanted only; they do not stand in the way of a release.
constexpr CauseSet kLiveOnly = bit(Cause::roll) | bit(Cause::pitch) | bit(Cause::body_rate) |
                               bit(Cause::base_low) | bit(Cause::measured_torque) |
                               bit(Cause::joint_position) | bit(Cause::joint_speed) | bit(Cause::frame_jump) |
                               bit(Cause::tick_overrun) | bit(Cause::baton_lost) |
                               bit(Cause::command_not_finite);

double positive(double x) noexcept { return x > 0.0 && std::isfinite(x) ? x : 0.0; }

CauseSet causes_at_once(const Limits& limits) noexcept {
  CauseSet set = kAlwaysAtOnce;
  for (int c = 0; c < kCauseCount; ++c) {
    const bool ramps = limits.reaction[static_cast<std::size_t>(c)] == Reaction::ramp_down;
    if (!ramps) set |= bit(static_cast<Cause>(c));
  }
  return set;
}

StopSequence sequence_of(const Limits& limits) noexcept {
  const double tick_s = sound_tick_s(limits.tick_s);
  const std::int64_t damp = ticks_within(limits.damp_s, tick_s);
  const std::int64_t whole = ticks_within(positive(limits.damp_s) + positive(limits.lower_s), tick_s);
  return {damp, whole - damp};
}

}  // namespace

Gate::Gate(const Limits& limits) noexcept
    : limits_(limits),
      joints_(joints_of(limits)),
      tick_s_(sound_tick_s(limits.tick_s)),
      at_once_(causes_at_once(limits)),
      ticks_(limits.tick_s),
      frame_(limits),
      body_(limits),
      joint_(limits),
      pack_(limits),
      stop_(sequence_of(limits)) {
  for (std::size_t j = 0; j < envelope_.size(); ++j) {
    const double peak = positive(limits.joint[j].peak_torque_nm);
    // before + step is rounded once; taking that rounding off the step keeps the change within the limit
    // exactly.
    const double step = positive(limits.joint[j].slew_nm_per_s) * tick_s_;
    envelope_[j] = {peak, positive(step - peak * std::numeric_limits<double>::epsilon())};
  }
}

DriveCommand Gate::judge(const SensorFrame& frame, const Torques<>& wanted, const JointAngles<>& target,
                         const Flags& flags, TimeNs now, double late_s) noexcept {
  ++tick_;
  const std::int64_t elapsed = ticks_.advance(now);
  Findings found;
  look(frame, flags, elapsed, found);
  if (flags.torque_wanted && phase() == Phase::armed) look_at_command(wanted, target, found);
  if (live(flags) && !(late_s <= limits_.overrun_s)) {
    found.note(Cause::tick_overrun, -1, late_s, limits_.overrun_s);
  }
  if (flags.stop) found.note(Cause::operator_stop);
  if (live(flags) && flags.baton_lost) found.note(Cause::baton_lost);
  if (flags.internal_stop) found.note(Cause::internal_stop);

  stop_.advance(elapsed);
  react(found, flags, now);
  blocking_ = found.all() & ~kLiveOnly;
  wanted_ = flags.torque_wanted;
  return command(frame, wanted, flags);
}

void Gate::look(const SensorFrame& frame, const Flags& flags, std::int64_t elapsed,
                Findings& found) noexcept {
  const bool powered = live(flags);
  if (frame.emergency_stop) found.note(Cause::emergency_stop);
  if (flags.halt) found.note(Cause::operator_halt);
  if (flags.bus_error) found.note(Cause::bus_error);
  frame_.look(limits_, frame, flags.frame_new, powered, elapsed, found);
  if (!frame_.seen() && !powered)
    return;  // the drives have not spoken yet; hold() says that nothing may begin
  if (frame_.fresh()) body_.follow(limits_, frame, frame_.gap());
  body_.look(limits_, frame, powered, flags.watch_base && phase() == Phase::armed, elapsed, found);
  joint_.look(limits_, frame, powered, elapsed, found);
  heat(frame, elapsed, found);
  pack_.look(limits_, frame, elapsed, found);
  keep_for_hold(frame);
}

/// A measured torque that cannot be believed counts as the peak while torque is on.
void Gate::heat(const SensorFrame& frame, std::int64_t elapsed, Findings& found) noexcept {
  const double span_s = static_cast<double>(elapsed) * tick_s_;
  for (int j = 0; j < joints_; ++j) {
    const auto i = static_cast<std::size_t>(j);
    const JointLimits& joint = limits_.joint[i];
    const double measured = std::fabs(frame.torque[j]);
    const bool believed = measured <= kImpossibleFactor * joint.trip_torque_nm;
    const double torque = believed ? measured : (powered_ ? envelope_[i].peak : 0.0);
    thermal_.step(j, torque, joint.rated_torque_nm, joint.thermal_tau_s, span_s);
    if (!(thermal_.theta(j) < 1.0)) found.note(Cause::thermal_model, j, thermal_.theta(j), 1.0);
  }
}

void Gate::look_at_command(const Torques<>& wanted, const JointAngles<>& target,
                           Findings& found) const noexcept {
  for (int j = 0; j < joints_; ++j) {
    if (!std::isfinite(wanted[j])) found.note(Cause::command_not_finite, j, wanted[j], 0.0);
    if (!std::isfinite(target[j])) found.note(Cause::command_not_finite, j, target[j], 0.0);
  }
}

void Gate::react(const Findings& found, const Flags& flags, TimeNs now) noexcept {
  const bool can_ramp = powered_ && flags.torque_wanted && !flags.bus_error && frame_.speeds_usable();
  const bool at_once = !can_ramp || (found.all() & at_once_) != 0;
  if (phase() == Phase::armed && found.any()) {
    trip_ = found.first();
    trip_.tick = tick_;
    trip_.time = now;
    stop_.begin(at_once);
    trip_.reaction = phase() == Phase::off ? Reaction::torque_off : Reaction::ramp_down;
  } else if (phase() != Phase::armed && phase() != Phase::off && at_once) {
    stop_.cut();
    trip_.reaction = Reaction::torque_off;
  }
}

DriveCommand Gate::command(const SensorFrame& frame, const Torques<>& wanted, const Flags& flags) noexcept {
  DriveCommand out;
  out.joint_count_ = joints_;
  out.tick_ = tick_;
  out.torque_on_ = live(flags);
  clamped_ = false;
  for (int j = 0; j < joints_ && out.torque_on_; ++j) {
    const Envelope& limit = envelope_[static_cast<std::size_t>(j)];
    const double torque = peak_clamp(desired(frame, wanted, j), limit.peak);
    out.torque_[j] = slew_clamp(torque, last_[j], limit.step);
    clamped_ = clamped_ || (phase() == Phase::armed && out.torque_[j] != wanted[j]);
  }
  powered_ = out.torque_on_;
  last_ = out.torque_;
  return out;
}

/// Armed: the wanted torque, faded near the edges. In a stop: resistance to the joint's motion.
double Gate::desired(const SensorFrame& frame, const Torques<>& wanted, int joint) const noexcept {
  const JointLimits& limit = limits_.joint[static_cast<std::size_t>(joint)];
  const double speed = frame.speed[joint];
  if (phase() != Phase::armed) {
    return -stop_.damping_share() * positive(limit.damping_nm_s_per_rad) * speed;
  }
  const double inside = edge_fade(wanted[joint], frame.angle[joint], limit.angle_min_rad, limit.angle_max_rad,
                                  limit.soft_edge_rad);
  return speed_fade(inside, speed, limit.soft_speed_rad_per_s, limit.speed_max_rad_per_s);
}

void Gate::keep_for_hold(const SensorFrame& frame) noexcept {
  winding_warm_ = false;
  for (int j = 0; j < joints_; ++j) {
    const JointLimits& joint = limits_.joint[static_cast<std::size_t>(j)];
    if (!(frame.winding[j] < joint.winding_warm_c)) winding_warm_ = true;
  }
  pack_floor_ = !(frame.pack_voltage_v >= limits_.pack_floor_v);
}

Hold Gate::hold() const noexcept {
  if (phase() != Phase::armed) return Hold::tripped;
  if (winding_warm_) return Hold::winding_warm;
  if (!(thermal_worst() < kThermalHold)) return Hold::thermal_model;
  return pack_floor_ ? Hold::pack_floor : Hold::none;
}

bool Gate::release() noexcept {
  if (phase() != Phase::off || blocking_ != 0 || wanted_) return false;
  trip_ = Trip{};
  stop_.rearm();
  return true;
}

void Gate::reset_filters() noexcept {
  ticks_.reset();
  frame_.reset();
  body_.reset();
  joint_.reset();
}

}  // namespace pastern::safety
