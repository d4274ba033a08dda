// Finite, possible, new, alive, without jumps. Every comparison is written so that NaN is found.
#include "safety/frame_watch.h"

#include <cmath>

#include "safety/timing.h"

namespace pastern::safety {
namespace {

constexpr int kNoJoint = -1;

bool within(double x, double low, double high) noexcept { return x >= low && x <= high; }

template <class Unit, class Frame>
bool finite(const Vector3<Unit, Frame>& v) noexcept {
  return std::isfinite(v.x) && std::isfinite(v.y) && std::isfinite(v.z);
}

void note_if_not_finite(double x, int joint, Findings& found) noexcept {
  if (!std::isfinite(x)) found.note(Cause::frame_not_finite, joint, x, 0.0);
}

template <class Unit, class Frame>
void note_if_not_finite(const Vector3<Unit, Frame>& v, Findings& found) noexcept {
  if (!finite(v)) found.note(Cause::frame_not_finite);
}

void look_for_finite_joints(const SensorFrame& frame, int joint_count, Findings& found) noexcept {
  for (int j = 0; j < joint_count; ++j) {
    note_if_not_finite(frame.angle[j], j, found);
    note_if_not_finite(frame.speed[j], j, found);
    note_if_not_finite(frame.torque[j], j, found);
    note_if_not_finite(frame.winding[j], j, found);
    note_if_not_finite(frame.housing[j], j, found);
  }
}

void look_for_finite_rest(const SensorFrame& frame, Findings& found) noexcept {
  note_if_not_finite(frame.rate, found);
  note_if_not_finite(frame.acceleration, found);
  note_if_not_finite(frame.pack_voltage_v, kNoJoint, found);
  note_if_not_finite(frame.pack_current_a, kNoJoint, found);
  if (frame.has_position) note_if_not_finite(frame.position, found);
  if (!frame.has_attitude) return;
  const Attitude<>& q = frame.attitude;
  note_if_not_finite(q.w, kNoJoint, found);
  note_if_not_finite(q.x, kNoJoint, found);
  note_if_not_finite(q.y, kNoJoint, found);
  note_if_not_finite(q.z, kNoJoint, found);
}

struct Range {
  double low;
  double high;
};

constexpr Range around(double size) noexcept { return {-size, size}; }

// Not finite has its own cause and is not noted twice.
void note_if_outside(double x, const Range& range, int joint, Findings& found) noexcept {
  if (std::isnan(x) || within(x, range.low, range.high)) return;
  found.note(Cause::frame_out_of_range, joint, x, x > range.high ? range.high : range.low);
}

template <class Unit, class Frame>
void note_if_outside(const Vector3<Unit, Frame>& v, double size, Findings& found) noexcept {
  note_if_outside(v.x, around(size), kNoJoint, found);
  note_if_outside(v.y, around(size), kNoJoint, found);
  note_if_outside(v.z, around(size), kNoJoint, found);
}

Range possible_speed(const JointLimits& joint) noexcept {
  return around(kImpossibleFactor * joint.speed_max_rad_per_s);
}

void look_for_possible_joints(const Limits& limits, const SensorFrame& frame, int joint_count,
                              Findings& found) noexcept {
  for (int j = 0; j < joint_count; ++j) {
    const JointLimits& joint = limits.joint[static_cast<std::size_t>(j)];
    note_if_outside(frame.angle[j],
                    {joint.angle_min_rad - kImpossibleAngle, joint.angle_max_rad + kImpossibleAngle}, j,
                    found);
    note_if_outside(frame.speed[j], possible_speed(joint), j, found);
    note_if_outside(frame.torque[j], around(kImpossibleFactor * joint.trip_torque_nm), j, found);
    note_if_outside(frame.winding[j], {kColdestC, kHottestC}, j, found);
    note_if_outside(frame.housing[j], {kColdestC, kHottestC}, j, found);
  }
}

void look_for_possible_rest(const Limits& limits, const SensorFrame& frame, Findings& found) noexcept {
  note_if_outside(frame.rate, limits.rate_range_rad_per_s, found);
  note_if_outside(frame.acceleration, limits.acceleration_range_m_per_s2, found);
  note_if_outside(frame.pack_voltage_v, {0.0, kMostPackV}, kNoJoint, found);
  note_if_outside(frame.pack_current_a, around(kImpossibleFactor * limits.pack_current_max_a), kNoJoint,
                  found);
  if (frame.has_position) note_if_outside(frame.position, kMostPositionM, found);
  if (frame.has_attitude) {
    const Attitude<>& q = frame.attitude;
    note_if_outside(q.w * q.w + q.x * q.x + q.y * q.y + q.z * q.z, {0.9, 1.1}, kNoJoint, found);
  }
}

/// By whatever stands in the limits; what is not finite makes nothing possible.
JointRanges ranges_of(const JointLimits& joint) noexcept {
  return {joint.angle_min_rad - kImpossibleAngle, joint.angle_max_rad + kImpossibleAngle,
          possible_speed(joint).high, kImpossibleFactor * joint.trip_torque_nm};
}

bool all_finite(const JointRanges& ranges) noexcept {
  return std::isfinite(ranges.angle_low) && std::isfinite(ranges.angle_high) && std::isfinite(ranges.speed) &&
         std::isfinite(ranges.torque);
}

bool all_speeds_possible(const Limits& limits, const SensorFrame& frame, int joint_count) noexcept {
  for (int j = 0; j < joint_count; ++j) {
    const Range range = possible_speed(limits.joint[static_cast<std::size_t>(j)]);
    // Finite on its own account: with a limit that is not, every speed would be possible.
    if (!std::isfinite(frame.speed[j]) || !within(frame.speed[j], range.low, range.high)) return false;
  }
  return true;
}

template <class Unit, class Frame>
bool same(const Vector3<Unit, Frame>& a, const Vector3<Unit, Frame>& b) noexcept {
  return a.x == b.x && a.y == b.y && a.z == b.z;
}

/// No analogue value differs. The counter, the time and the switches are not analogue.
bool same_values(const SensorFrame& a, const SensorFrame& b, int joint_count) noexcept {
  for (int j = 0; j < joint_count; ++j) {
    if (a.angle[j] != b.angle[j] || a.speed[j] != b.speed[j] || a.torque[j] != b.torque[j] ||
        a.winding[j] != b.winding[j] || a.housing[j] != b.housing[j]) {
      return false;
    }
  }
  const bool pack = a.pack_voltage_v == b.pack_voltage_v && a.pack_current_a == b.pack_current_a;
  return pack && same(a.rate, b.rate) && same(a.acceleration, b.acceleration);
}

}  // namespace

FrameWatch::FrameWatch(const Limits& limits) noexcept
    : stale_ticks_(ticks_within(limits.frame_stale_s, sound_tick_s(limits.tick_s))),
      tick_s_(sound_tick_s(limits.tick_s)),
      stuck_rad_(kStuckShare * limits.frame_jump_rad) {
  for (int j = 0; j < joints_of(limits); ++j) {
    const auto i = static_cast<std::size_t>(j);
    ranges_[i] = ranges_of(limits.joint[i]);
    ranges_finite_ = ranges_finite_ && all_finite(ranges_[i]);
  }
}

void FrameWatch::reset() noexcept {
  seen_ = false;
  age_ = 0;
  gap_ = 1;
  frozen_ = 0;
  still_.fill(0);
}

void FrameWatch::look(const Limits& limits, const SensorFrame& frame, bool frame_new, bool live,
                      std::int64_t elapsed, Findings& found) noexcept {
  const int joint_count = joints_of(limits);
  if (!seen_ && !frame_new && !live) {
    fresh_ = speeds_usable_ = false;
    return;
  }
  // What lies inside finite ranges is finite as well: the long way only tells what is wrong.
  const bool joints_sound = ranges_finite_ && all_possible(frame, joint_count);
  if (!joints_sound) look_for_finite_joints(frame, joint_count, found);
  look_for_finite_rest(frame, found);
  if (frame.joint_count != joint_count) {
    found.note(Cause::frame_out_of_range, kNoJoint, frame.joint_count, joint_count);
  }
  if (!joints_sound) look_for_possible_joints(limits, frame, joint_count, found);
  look_for_possible_rest(limits, frame, found);
  look_for_age(limits, frame, frame_new, elapsed, found);
  if (!live) {
    still_.fill(0);
  } else if (frame_new) {
    // Also in a frame whose counter has not risen: its angles reach the fades and the policy all the same.
    look_at_steps(limits, frame, found);
  }
  if (fresh_) {
    look_for_life(limits, frame, found);
    remember(frame, joint_count);
  }
  const CauseSet unfit = bit(Cause::frame_stale) | bit(Cause::frame_frozen);
  speeds_usable_ = (found.all() & unfit) == 0 && frame.joint_count == joint_count &&
                   (joints_sound || all_speeds_possible(limits, frame, joint_count));
}

bool FrameWatch::all_possible(const SensorFrame& frame, int joint_count) const noexcept {
  for (int j = 0; j < joint_count; ++j) {
    const JointRanges& range = ranges_[static_cast<std::size_t>(j)];
    if (!within(frame.angle[j], range.angle_low, range.angle_high) ||
        !(std::fabs(frame.speed[j]) <= range.speed) || !(std::fabs(frame.torque[j]) <= range.torque) ||
        !within(frame.winding[j], kColdestC, kHottestC) || !within(frame.housing[j], kColdestC, kHottestC)) {
      return false;
    }
  }
  return true;
}

void FrameWatch::look_for_age(const Limits& limits, const SensorFrame& frame, bool frame_new,
                              std::int64_t elapsed, Findings& found) noexcept {
  const std::int64_t age = age_ < kLongestTicks ? age_ + elapsed : age_;
  fresh_ = frame_new && (!seen_ || frame.counter > last_.counter);
  gap_ = fresh_ ? age : gap_;
  age_ = fresh_ ? 0 : age;
  if (age_ > stale_ticks_) {
    const double age_s = static_cast<double>(age_) * tick_s_;
    found.note(Cause::frame_stale, kNoJoint, age_s, limits.frame_stale_s, age_s);
  }
}

void FrameWatch::look_for_life(const Limits& limits, const SensorFrame& frame, Findings& found) noexcept {
  const bool changed = !seen_ || !same_values(frame, last_, joints_of(limits));
  frozen_ = changed ? 0 : (frozen_ < kLongestTicks ? frozen_ + 1 : frozen_);
  if (frozen_ > 0 && frozen_ >= limits.frame_frozen_ticks) {
    found.note(Cause::frame_frozen, kNoJoint, frozen_, limits.frame_frozen_ticks, frozen_ * tick_s_);
  }
}

void FrameWatch::look_at_steps(const Limits& limits, const SensorFrame& frame, Findings& found) noexcept {
  if (!seen_) return;
  for (int j = 0; j < joints_of(limits); ++j) {
    const double step = std::fabs(frame.angle[j] - last_.angle[j]);
    if (!(step <= limits.frame_jump_rad)) found.note(Cause::frame_jump, j, step, limits.frame_jump_rad);
    if (!(step > 0.0)) {
      if (fresh_) look_at_still_joint(limits, frame.speed[j], j, found);
    } else {
      still_[static_cast<std::size_t>(j)] = 0;
    }
  }
}

/// The first frames are let pass: where a speed is filtered it goes on for a while when a joint has come to
/// rest. Then the way that the joint makes by its speed is added up, in spans, so that a small error of the
/// speed does not pose as motion.
void FrameWatch::look_at_still_joint(const Limits& limits, double speed, int joint,
                                     Findings& found) noexcept {
  const auto j = static_cast<std::size_t>(joint);
  const int still = ++still_[j];
  const int first = limits.frame_frozen_ticks;
  if (still <= first) {
    crept_[j] = 0.0;
    return;
  }
  crept_[j] += speed * static_cast<double>(gap_) * tick_s_;
  if (!(std::fabs(crept_[j]) <= stuck_rad_)) {
    found.note(Cause::frame_frozen, joint, still, first, still * tick_s_);
  } else if (still / kStuckSpan >= first) {
    still_[j] = first;
    crept_[j] = 0.0;
  }
}

void FrameWatch::remember(const SensorFrame& frame, int joint_count) noexcept {
  last_.counter = frame.counter;
  for (int j = 0; j < joint_count; ++j) {
    last_.angle[j] = frame.angle[j];
    last_.speed[j] = frame.speed[j];
    last_.torque[j] = frame.torque[j];
    last_.winding[j] = frame.winding[j];
    last_.housing[j] = frame.housing[j];
  }
  last_.rate = frame.rate;
  last_.acceleration = frame.acceleration;
  last_.pack_voltage_v = frame.pack_voltage_v;
  last_.pack_current_a = frame.pack_current_a;
  seen_ = true;
}

}  // namespace pastern::safety
