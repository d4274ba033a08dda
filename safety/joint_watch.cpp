// One pass over the joints. Comparisons hold for the safe side only, so NaN is always found.
#include "safety/joint_watch.h"

#include <cmath>

#include "safety/frame_watch.h"

namespace pastern::safety {

JointWatch::JointWatch(const Limits& limits) noexcept : tick_s_(sound_tick_s(limits.tick_s)) {
  for (std::size_t j = 0; j < torque_hold_ticks_.size(); ++j) {
    torque_hold_ticks_[j] = hold_ticks(limits.joint[j].trip_torque_hold_s, tick_s_);
  }
}

void JointWatch::look(const Limits& limits, const SensorFrame& frame, bool live, std::int64_t elapsed,
                      Findings& found) noexcept {
  for (int j = 0; j < joints_of(limits); ++j) {
    const auto i = static_cast<std::size_t>(j);
    const JointLimits& limit = limits.joint[i];
    const double torque = frame.torque[j];
    torque_high_[i].look(live && !(std::fabs(torque) <= limit.trip_torque_nm), elapsed);
    if (torque_high_[i].reached(torque_hold_ticks_[i])) {
      found.note(Cause::measured_torque, j, torque, limit.trip_torque_nm,
                 static_cast<double>(torque_high_[i].ticks()) * tick_s_);
    }
    if (live) {
      look_at_range(limit, frame.angle[j], frame.speed[j], j, found);
    } else {
      been_clear_[i] = false;
    }
    if (!(frame.winding[j] < limit.winding_max_c)) {
      found.note(Cause::winding_temperature, j, frame.winding[j], limit.winding_max_c);
    }
  }
}

void JointWatch::look_at_range(const JointLimits& limit, double angle, double speed, int joint,
                               Findings& found) noexcept {
  const double width = limit.soft_edge_rad > 0.0 ? limit.soft_edge_rad : 0.0;
  bool& been_clear = been_clear_[static_cast<std::size_t>(joint)];
  been_clear = been_clear || (angle >= limit.angle_min_rad + width && angle <= limit.angle_max_rad - width);
  const double beyond = been_clear ? 0.0 : width;
  if (!(angle >= limit.angle_min_rad - beyond)) {
    found.note(Cause::joint_position, joint, angle, limit.angle_min_rad);
  }
  if (!(angle <= limit.angle_max_rad + beyond)) {
    found.note(Cause::joint_position, joint, angle, limit.angle_max_rad);
  }
  if (!(std::fabs(speed) <= limit.speed_max_rad_per_s)) {
    found.note(Cause::joint_speed, joint, speed, limit.speed_max_rad_per_s);
  }
}

void JointWatch::reset() noexcept {
  for (HoldClock& clock : torque_high_) clock.reset();
}

}  // namespace pastern::safety
