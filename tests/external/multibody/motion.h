// States, loads and accelerations that pass between the simulated robot and the library it is compared with.
// Joints in the robot file's order; SI units; a sliding joint's "angle" is its travel in metres.
#pragma once

#include <array>
#include <vector>

namespace pastern::multibody {

struct Motion {
  std::array<double, 4> attitude{1, 0, 0, 0};  ///< unit quaternion, scalar first, trunk to world
  std::array<double, 3> position{};            ///< of the trunk frame's origin, world, m
  std::array<double, 3> velocity{};            ///< of that point, world axes, m/s
  std::array<double, 3> rate{};                ///< trunk axes, rad/s
  std::vector<double> angle;
  std::vector<double> speed;
};

/// The joint feels torque - viscosity * (speed at the end of the step), and carries a rotor.
struct Drives {
  std::vector<double> torque;     ///< N m
  std::vector<double> rotor;      ///< kg m2 on the diagonal of the joint-space inertia
  std::vector<double> viscosity;  ///< N m s/rad
  double step_s{0.125};           ///< over which viscosity is implicit
};

struct Accelerations {
  std::array<double, 6>
      trunk{};  ///< [angular; linear of the trunk frame's origin], trunk axes, no gravity taken off
  std::vector<double> joint;
};

}  // namespace pastern::multibody
