// A robot file's body as a skeleton of DART 6.12, built from the file alone: it shares nothing with the
// simulated robot. Trees of any shape, hinges and sliding joints. Gravity 9.80665 m/s2.
#pragma once

#include <memory>

#include "pastern/v1/robot.pb.h"
#include "tests/external/multibody/motion.h"

namespace pastern::multibody {

class Reference {
 public:
  /// Parents must come before their children, as in a checked robot file.
  explicit Reference(const v1::Robot& robot);
  ~Reference();
  Reference(Reference&&) noexcept;
  Reference& operator=(Reference&&) noexcept;

  /// The library's articulated-body recursion. Rotors and viscosity go in as its own implicit joint damping
  /// d: it adds step * d to the diagonal, so d = rotor / step + viscosity, and what d takes off the torque
  /// for the rotor is put back.
  [[nodiscard]] Accelerations by_recursion(const Motion& motion, const Drives& drives);
  /// The library's mass matrix and bias forces, solved densely here: a second way to the same numbers.
  [[nodiscard]] Accelerations by_mass_matrix(const Motion& motion, const Drives& drives);

  /// Feet (balls of the robot file's legs) on a level floor, the library's own collision detection and
  /// contact solver. Once, before the first step().
  void put_on_floor(double friction, double step_s);
  void place(const Motion& motion);
  /// One step of the library's world under these joint torques.
  void step(const std::vector<double>& torque);
  /// Joint angles and speeds as they are, in joint order.
  void read(std::vector<double>& angle, std::vector<double>& speed) const;
  [[nodiscard]] int contacts() const;  ///< of the last step
  [[nodiscard]] double trunk_height_m() const;

 private:
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::multibody
