// What a robot tells in one tick, and what it is told. Fixed capacity, SI units, no heap.
#pragma once

#include <cstdint>

#include "safety/units.h"

namespace pastern::safety {

/// One reading of all sensors, as the drives and the IMU gave it: raw, not estimated.
struct SensorFrame {
  std::uint64_t counter{0};  ///< Rises by one with every new frame; a repeated number is a stale frame.
  TimeNs time;               ///< When the frame was sampled.
  std::int32_t joint_count{0};
  JointAngles<> angle;                                ///< rad
  JointSpeeds<> speed;                                ///< rad/s
  Torques<> torque;                                   ///< measured, N m at the joint
  Temperatures<> winding;                             ///< deg C
  Temperatures<> housing;                             ///< deg C
  Vector3<RadianPerSecond, Body> rate;                ///< IMU, rad/s
  Vector3<MetrePerSecondSquared, Body> acceleration;  ///< IMU specific force; +g upward at rest
  bool has_attitude{false};                           ///< true when the IMU gives an attitude of its own
  Attitude<> attitude;
  bool has_position{false};  ///< true when an external source gives the trunk's place
  Vector3<Metre, World> position;
  double pack_voltage_v{0};
  double pack_current_a{0};
  bool emergency_stop{false};  ///< the emergency-stop input is open
};

/// What reaches the drives: torques, or no torque at all. Only the gate can make one.
class DriveCommand {
 public:
  /// False: drives must not produce torque (STO of IEC 61800-5-2 in meaning, not in certification).
  [[nodiscard]] bool torque_on() const noexcept { return torque_on_; }
  [[nodiscard]] const Torques<>& torque() const noexcept { return torque_; }
  [[nodiscard]] std::int32_t joint_count() const noexcept { return joint_count_; }
  [[nodiscard]] std::uint64_t tick() const noexcept { return tick_; }

 private:
  friend class Gate;
  DriveCommand() = default;

  bool torque_on_{false};
  std::int32_t joint_count_{0};
  std::uint64_t tick_{0};
  Torques<> torque_;
};

}  // namespace pastern::safety
