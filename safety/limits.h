// Every limit of the gate, made once from a checked robot file and immutable afterwards.
// Values are plain numbers in SI units; each names its unit.
#pragma once

#include <array>
#include <cstdint>

#include "safety/units.h"

namespace pastern::safety {

inline constexpr int kMaxLegs = 8;
inline constexpr int kMaxLegJoints = 4;

/// Why a trip happened. The order is part of the journal's and the link's format: append only.
enum class Cause : std::uint8_t {
  none = 0,
  roll,                 ///< rad
  pitch,                ///< rad
  body_rate,            ///< rad/s
  base_low,             ///< m
  measured_torque,      ///< N m
  joint_position,       ///< rad
  joint_speed,          ///< rad/s
  winding_temperature,  ///< deg C
  thermal_model,        ///< 1 = limit (IEC 60255-149)
  pack_voltage_low,     ///< V
  pack_current_high,    ///< A
  frame_not_finite,
  frame_out_of_range,
  frame_stale,   ///< s since the last new frame
  frame_frozen,  ///< ticks without any change in any analogue value, or in the angle of a joint that moves
  frame_jump,    ///< rad between two frames
  tick_overrun,  ///< s
  baton_lost,    ///< s since the last sign of life
  operator_stop,
  operator_halt,
  emergency_stop,
  command_not_finite,
  bus_error,      ///< read or write of the drives failed
  internal_stop,  ///< the program asks for a stop (disk full, shutting down)
  count_
};
inline constexpr int kCauseCount = static_cast<int>(Cause::count_);

/// What the gate does for a cause. Stop categories of IEC 60204-1: ramp_down ~ category 1 (SS1), torque_off ~
/// category 0 (STO).
enum class Reaction : std::uint8_t { ramp_down = 0, torque_off = 1 };

struct JointLimits {
  double peak_torque_nm{0};      ///< clamp of the commanded torque
  double slew_nm_per_s{0};       ///< clamp of its change
  double trip_torque_nm{0};      ///< measured torque beyond this ...
  double trip_torque_hold_s{0};  ///< ... for longer than this trips
  double angle_min_rad{0};       ///< hard edge: beyond it trips (for one parked beyond: joint_watch.h)
  double angle_max_rad{0};
  double soft_edge_rad{0};        ///< width inside the hard edge where torque pushing outward fades to zero
  double speed_max_rad_per_s{0};  ///< hard edge
  double soft_speed_rad_per_s{
      0};                     ///< from here to the hard edge, torque that speeds the joint up fades to zero
  double winding_warm_c{0};   ///< no new episode at or above
  double winding_max_c{0};    ///< trips at or above
  double rated_torque_nm{0};  ///< continuous torque, the thermal model's k*IB in terms of torque
  double thermal_tau_s{0};    ///< first-order time constant of the thermal model (IEC 60255-149)
  double damping_nm_s_per_rad{0};  ///< used by the stop sequence to damp
};

/// A leg as a chain of hinges, proximal first, for the gate's own idea of how high the trunk stands.
struct LegChain {
  int joint_count{0};
  std::array<int, kMaxLegJoints> joint{};                    ///< index in the joint order
  std::array<Vector3<Metre, Body>, kMaxLegJoints> origin{};  ///< in the parent link's frame
  std::array<Vector3<Metre, Body>, kMaxLegJoints> axis{};    ///< unit vectors
  Vector3<Metre, Body> foot{};                               ///< in the last link's frame
};

struct Limits {
  int joint_count{0};
  std::array<JointLimits, kMaxJoints> joint{};
  int leg_count{0};
  std::array<LegChain, kMaxLegs> leg{};
  double tick_s{0.001};  ///< nominal period of the cycle
  double tilt_rad{0};    ///< roll or pitch beyond this for tilt_hold_s trips
  double tilt_hold_s{0};
  double tilt_at_once_rad{0};
  double tilt_filter_s{0};  ///< time constant of the gate's own tilt filter (gyro against gravity)
  double body_rate_rad_per_s{0};
  double body_rate_hold_s{0};
  double base_low_m{0};  ///< least height of the trunk over the lowest foot, while walking or standing
  double base_low_hold_s{0};
  double pack_low_v{0};    ///< trips below (with hold)
  double pack_floor_v{0};  ///< no new episode below
  double pack_hold_s{0};
  double pack_current_max_a{0};
  double frame_stale_s{0};  ///< no new frame for longer trips
  int frame_frozen_ticks{0};
  double frame_jump_rad{0};
  double rate_range_rad_per_s{0};  ///< physical range of the IMU
  double acceleration_range_m_per_s2{0};
  double overrun_s{0};  ///< a tick later than this trips
  double damp_s{0};     ///< stop sequence: damp, then lower, then torque off
  double lower_s{0};
  std::array<Reaction, kCauseCount> reaction{};  ///< chosen per cause in the robot file
};

}  // namespace pastern::safety
