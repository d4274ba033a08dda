// A small robot for the gate's tests: limits, a frame that nothing objects to, and a loop of ticks.
#pragma once

#include <gtest/gtest.h>

#include <cmath>
#include <cstdint>
#include <limits>

#include "safety/gate.h"

namespace pastern::safety::test {

inline constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
inline constexpr double kInf = std::numeric_limits<double>::infinity();
inline constexpr double kTick = 0.001;
inline constexpr std::int64_t kTickNs = 1'000'000;

/// Two hinges about y, 0.25 m each, hip at the trunk's origin; q = 0 hangs straight down.
inline LegChain two_link_leg() {
  LegChain leg;
  leg.joint_count = 2;
  leg.joint = {0, 1, 0, 0};
  leg.origin[0] = {0.0, 0.0, 0.0};
  leg.origin[1] = {0.0, 0.0, -0.25};
  leg.axis[0] = {0.0, 1.0, 0.0};
  leg.axis[1] = {0.0, 1.0, 0.0};
  leg.foot = {0.0, 0.0, -0.25};
  return leg;
}

inline JointLimits a_joint() {
  JointLimits joint;
  joint.peak_torque_nm = 30.0;
  joint.slew_nm_per_s = 5000.0;  // 5 N m a tick
  joint.trip_torque_nm = 40.0;
  joint.trip_torque_hold_s = 0.020;
  joint.angle_min_rad = -1.0;
  joint.angle_max_rad = 2.0;
  joint.soft_edge_rad = 0.1;
  joint.speed_max_rad_per_s = 20.0;
  joint.soft_speed_rad_per_s = 16.0;
  joint.winding_warm_c = 60.0;
  joint.winding_max_c = 90.0;
  joint.rated_torque_nm = 12.0;
  joint.thermal_tau_s = 60.0;
  joint.damping_nm_s_per_rad = 4.0;
  return joint;
}

inline Limits some_limits(int joint_count = 3) {
  Limits limits;
  limits.joint_count = joint_count;
  for (auto& joint : limits.joint) joint = a_joint();
  limits.leg_count = 1;
  limits.leg[0] = two_link_leg();
  limits.tick_s = kTick;
  limits.tilt_rad = 0.6;
  limits.tilt_hold_s = 0.050;
  limits.tilt_at_once_rad = 0.9;
  limits.tilt_filter_s = 0.5;
  limits.body_rate_rad_per_s = 6.0;
  limits.body_rate_hold_s = 0.030;
  limits.base_low_m = 0.20;
  limits.base_low_hold_s = 0.040;
  limits.pack_low_v = 36.0;
  limits.pack_floor_v = 40.0;
  limits.pack_hold_s = 0.025;
  limits.pack_current_max_a = 60.0;
  limits.frame_stale_s = 0.005;
  limits.frame_frozen_ticks = 10;
  limits.frame_jump_rad = 0.2;
  limits.rate_range_rad_per_s = 30.0;
  limits.acceleration_range_m_per_s2 = 160.0;
  limits.overrun_s = 0.010;
  limits.damp_s = 0.100;
  limits.lower_s = 0.200;
  return limits;  // every reaction: ramp_down
}

/// The gate in a loop of its own: a new frame a tick, level, at rest, with a little life in one value.
class Loop {
 public:
  explicit Loop(const Limits& given = some_limits()) : limits(given), gate(given) {
    frame.joint_count = given.joint_count;
    frame.acceleration = {0.0, 0.0, kGravity};
    frame.pack_voltage_v = 46.0;
    frame.pack_current_a = 5.0;
    for (int j = 0; j < given.joint_count; ++j) frame.winding[j] = frame.housing[j] = 30.0;
    frame.angle[0] = 0.5;
    flags.torque_wanted = true;
  }

  DriveCommand tick() {
    if (flags.frame_new) {
      ++frame.counter;
      frame.housing[0] += frame.counter % 2 == 0 ? 0.01 : -0.01;
      frame.time.value += kTickNs;
    }
    now.value += kTickNs;
    return gate.judge(frame, wanted, target, flags, now, late_s);
  }
  void ticks(int count) {
    for (int i = 0; i < count; ++i) (void)tick();
  }
  /// Ticks until the phase is no longer `armed`, the tripping one included; `most` + 1 when it never is.
  int ticks_to_trip(int most) {
    for (int i = 1; i <= most; ++i) {
      (void)tick();
      if (gate.phase() != Phase::armed) return i;
    }
    return most + 1;
  }

  Limits limits;
  Gate gate;
  SensorFrame frame;
  Torques<> wanted;
  JointAngles<> target;
  Flags flags;
  TimeNs now;
  double late_s{0};
};

}  // namespace pastern::safety::test
