// Plain values between the stages of a tick. S is double on the robot.
#pragma once

#include "safety/units.h"

namespace pastern {

using safety::JointAngles;
using safety::JointSpeeds;
using safety::Torques;

/// What the robot thinks of its own body. Attitude from the IMU, speed and place from leg odometry or an
/// external source.
template <class S = double>
struct BodyEstimate {
  S roll_rad{};  ///< z-y-x (aerospace) sequence
  S pitch_rad{};
  S yaw_rad{};  ///< relative to the start of the walk
  safety::Vector3<safety::RadianPerSecond, safety::Body, S> rate{};
  safety::Vector3<safety::MetrePerSecond, safety::World, S> velocity{};  ///< along and across the lane, up
  safety::Vector3<safety::Metre, safety::World, S>
      position{};  ///< since the start of the walk; z over the feet
};

/// Joint angles that the PD loop steers to. `clipped` counts the joints whose target was outside the joint
/// range.
template <class S = double>
struct JointTarget {
  JointAngles<S> angle{};
  int clipped{0};
};

}  // namespace pastern
