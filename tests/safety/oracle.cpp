// The oracle: plain arithmetic on limits, written a second time on purpose.
#include "tests/safety/oracle.h"

#include <algorithm>
#include <cmath>

namespace pastern::safety::test {
namespace {

/// A limit that is not a positive number allows nothing.
double allowed(double limit) { return limit > 0 && limit <= 1.7976931348623157e308 ? limit : 0; }

double seconds(TimeNs from, TimeNs to) {
  return (static_cast<double>(to.value) - static_cast<double>(from.value)) * 1e-9;
}

bool bad(double x) { return !(std::fabs(x) <= 1.7976931348623157e308); }

}  // namespace

Oracle::Oracle(const Limits& limits)
    : limits_(limits),
      joints_(std::clamp(limits.joint_count, 0, kMaxJoints)),
      tick_s_(limits.tick_s >= 1e-5 && limits.tick_s <= 1 ? limits.tick_s : 1e-3) {}

void Oracle::reset() {
  have_frame_ = false;
  age_calls_ = 0;
}

void Oracle::note(Cause cause) {
  any_ = true;
  causes_ += std::string(" ") + name(cause);
  const bool off = limits_.reaction[static_cast<std::size_t>(cause)] == Reaction::torque_off;
  if (off || cause == Cause::operator_halt || cause == Cause::emergency_stop) at_once_ = true;
}

void Oracle::find_in_flags(const Input& in) {
  if (in.flags.stop) note(Cause::operator_stop);
  if (in.flags.halt) note(Cause::operator_halt);
  if (in.flags.internal_stop) note(Cause::internal_stop);
  if (in.flags.bus_error) note(Cause::bus_error);
  if (in.frame.emergency_stop) note(Cause::emergency_stop);
  always_ = any_;
  if (in.flags.bus_error) at_once_ = true;  // nothing is known of the joints
  if (!in.flags.torque_wanted) return;
  if (in.flags.baton_lost) note(Cause::baton_lost);
  if (!(in.late_s <= limits_.overrun_s)) note(Cause::tick_overrun);
}

void Oracle::find_in_joint(const Input& in, int j, bool fresh) {
  const JointLimits& limit = limits_.joint[static_cast<std::size_t>(j)];
  const SensorFrame& f = in.frame;
  if (bad(f.angle[j]) || bad(f.speed[j]) || bad(f.torque[j]) || bad(f.winding[j]) || bad(f.housing[j])) {
    note(Cause::frame_not_finite);
  }
  if (bad(f.speed[j])) at_once_ = true;  // no speed, no damping
  if (!(std::fabs(f.speed[j]) <= limit.speed_max_rad_per_s)) note(Cause::joint_speed);
  const double width = std::max(0.0, bad(limit.soft_edge_rad) ? 0.0 : limit.soft_edge_rad);
  if (!(f.angle[j] >= limit.angle_min_rad - width) || !(f.angle[j] <= limit.angle_max_rad + width)) {
    note(Cause::joint_position);
  }
  if (!(f.winding[j] < limit.winding_max_c)) note(Cause::winding_temperature);
  if (fresh && have_frame_ && !(std::fabs(f.angle[j] - angle_[j]) <= limits_.frame_jump_rad)) {
    note(Cause::frame_jump);
  }
}

void Oracle::find_age(const Input& in, bool fresh) {
  const bool counts = have_frame_ || powered_;  // parked and silent from the start: there is nothing to judge
  age_calls_ = fresh || !counts ? 0 : age_calls_ + 1;
  if (!in.flags.torque_wanted) return;
  if (static_cast<double>(age_calls_) * tick_s_ > std::max(0.0, limits_.frame_stale_s) + tick_s_ * 0.5) {
    note(Cause::frame_stale);
    at_once_ = true;
  }
}

void Oracle::find_in_frame(const Input& in, bool fresh) {
  const SensorFrame& f = in.frame;
  if (f.joint_count != joints_) {
    note(Cause::frame_out_of_range);
    at_once_ = true;
  }
  for (int j = 0; j < joints_; ++j) find_in_joint(in, j, fresh);
  for (const double x : {f.rate.x, f.rate.y, f.rate.z}) {
    if (bad(x)) note(Cause::frame_not_finite);
    if (std::fabs(x) > limits_.rate_range_rad_per_s) note(Cause::frame_out_of_range);
  }
  for (const double x : {f.acceleration.x, f.acceleration.y, f.acceleration.z}) {
    if (bad(x)) note(Cause::frame_not_finite);
    if (std::fabs(x) > limits_.acceleration_range_m_per_s2) note(Cause::frame_out_of_range);
  }
  if (bad(f.pack_voltage_v) || bad(f.pack_current_a)) note(Cause::frame_not_finite);
}

void Oracle::find(const Input& in, bool armed_before) {
  any_ = at_once_ = always_ = false;
  causes_.clear();
  find_in_flags(in);
  const bool fresh = in.flags.frame_new && (!have_frame_ || in.frame.counter > counter_);
  find_age(in, fresh);
  if (in.flags.torque_wanted) find_in_frame(in, fresh);
  for (int j = 0; j < joints_ && armed_before && in.flags.torque_wanted; ++j) {
    if (bad(in.wanted[j]) || bad(in.target[j])) note(Cause::command_not_finite);
  }
  if (!fresh) return;
  have_frame_ = true;
  counter_ = in.frame.counter;
  angle_ = in.frame.angle;
}

std::string Oracle::envelope(const DriveCommand& out) const {
  for (int j = 0; j < kMaxJoints; ++j) {
    const std::string where = "joint " + std::to_string(j) + ": ";
    const double torque = out.torque()[j];
    const JointLimits& limit = limits_.joint[static_cast<std::size_t>(j)];
    if (bad(torque)) return where + "torque is not finite";
    const bool on = out.torque_on() && j < joints_;
    if (!on && torque != 0) return where + "torque without permission";
    if (std::fabs(torque) > allowed(limit.peak_torque_nm)) return where + "beyond the peak";
    const double before = powered_ ? last_[j] : 0.0;
    if (on && std::fabs(torque - before) > allowed(limit.slew_nm_per_s) * tick_s_) {
      return where + "faster than the slew limit";
    }
  }
  return {};
}

/// In a stop a joint is braked, or an earlier torque is on its way to zero; never anything else.
std::string Oracle::damping_only(const Input& in, const DriveCommand& out) const {
  for (int j = 0; j < joints_; ++j) {
    const double torque = out.torque()[j];
    if (torque * in.frame.speed[j] > 0 && std::fabs(torque) > std::fabs(last_[j])) {
      return "joint " + std::to_string(j) + ": driven in a stop";
    }
  }
  return {};
}

bool Oracle::overdue(const Input& in) const {
  const double damp = limits_.damp_s > 0 ? limits_.damp_s : 0;
  const double lower = limits_.lower_s > 0 ? limits_.lower_s : 0;
  const double stop_s = damp + lower;
  const bool by_calls = static_cast<double>(stop_calls_) * tick_s_ > stop_s + 0.5 * tick_s_;
  const bool by_clock = !clock_went_back_ && seconds(stop_began_, in.now) > stop_s + 1.5 * tick_s_;
  return by_calls || by_clock;
}

std::string Oracle::stopping(const Input& in, const DriveCommand& out) {
  if (!stopping_ && any_) {
    stopping_ = true;
    stop_calls_ = 0;
    stop_began_ = in.now;
    clock_went_back_ = false;
    out.torque_on() ? ++seen_.ramps : ++seen_.cuts;
  } else if (stopping_) {
    ++stop_calls_;
  }
  if (!out.torque_on()) {
    if (stopping_ || in.flags.torque_wanted) latched_ = true;
    return {};
  }
  if (at_once_) return "torque in a tick with a cause that forbids it";
  if (latched_) return "torque again although nobody has released";
  if (!powered_ && any_) return "torque came on in a tick with a cause";
  if (!stopping_) return {};
  if (overdue(in)) return "torque after the end of the stop sequence";
  return damping_only(in, out);
}

std::string Oracle::judge(const Input& in, bool armed_before, const DriveCommand& out, bool armed_after) {
  ++ticks_;
  if (in.now < last_now_) clock_went_back_ = true;
  last_now_ = in.now;
  find(in, armed_before);
  if (any_) ++seen_.causes;
  if (out.torque_on()) ++seen_.powered;
  std::string wrong = envelope(out);
  if (wrong.empty() && out.tick() != ticks_) wrong = "ticks are not counted";
  if (wrong.empty() && out.joint_count() != joints_) wrong = "another number of joints";
  if (wrong.empty() && out.torque_on() && !in.flags.torque_wanted) wrong = "torque that nobody wants";
  if (wrong.empty() && any_ && armed_after) wrong = "armed in spite of a cause";
  if (wrong.empty()) wrong = stopping(in, out);
  last_ = out.torque();
  powered_ = out.torque_on();
  wanted_ = in.flags.torque_wanted;
  return wrong.empty() ? wrong : wrong + ";" + causes_;
}

std::string Oracle::judge_release(bool released) {
  if (!released) return {};
  ++seen_.releases;
  if (powered_) return "released with torque on";
  if (wanted_) return "released while torque was wanted: it would start at once";
  if (always_) return "released in spite of a cause";
  latched_ = stopping_ = false;
  return {};
}

}  // namespace pastern::safety::test
