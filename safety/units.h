// Units and frames as types. Standard library only; any thread; no heap.
// An array of radians does not convert to an array of newton metres: each unit is its own type.
#pragma once

#include <array>
#include <cstdint>

namespace pastern::safety {

/// Most joints that one robot may have; a robot file with more is refused when it is read.
inline constexpr int kMaxJoints = 32;

/// Unit tags. SI throughout; temperatures in degrees Celsius.
struct Radian {};
struct RadianPerSecond {};
struct NewtonMetre {};
struct Celsius {};
struct Metre {};
struct MetrePerSecond {};
struct MetrePerSecondSquared {};

/// Frame tags. World: x forward along the lane, y left, z up. Body: x forward, y left, z up, fixed to the
/// trunk.
struct World {};
struct Body {};

/// One number a joint, in the joint order of the robot file. Entries from `joint_count` on stay zero.
/// S is double on the robot; any scalar with the usual operators elsewhere.
template <class Unit, class S = double>
struct PerJoint {
  std::array<S, kMaxJoints> values{};

  constexpr S& operator[](int joint) noexcept { return values[static_cast<std::size_t>(joint)]; }
  constexpr const S& operator[](int joint) const noexcept { return values[static_cast<std::size_t>(joint)]; }
};

template <class S = double>
using JointAngles = PerJoint<Radian, S>;
template <class S = double>
using JointSpeeds = PerJoint<RadianPerSecond, S>;
template <class S = double>
using Torques = PerJoint<NewtonMetre, S>;
template <class S = double>
using Temperatures = PerJoint<Celsius, S>;

/// A vector with its unit and the frame it is written in.
template <class Unit, class Frame, class S = double>
struct Vector3 {
  S x{};
  S y{};
  S z{};
};

/// Unit quaternion, scalar first, turning body coordinates into world coordinates.
template <class S = double>
struct Attitude {
  S w{1};
  S x{0};
  S y{0};
  S z{0};
};

/// Nanoseconds of a monotonic clock. At stepped pace it is simulated time.
struct TimeNs {
  std::int64_t value{0};

  friend constexpr bool operator==(TimeNs a, TimeNs b) noexcept { return a.value == b.value; }
  friend constexpr bool operator<(TimeNs a, TimeNs b) noexcept { return a.value < b.value; }
};

}  // namespace pastern::safety
