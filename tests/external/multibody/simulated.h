// The simulated robot's side of the comparison: whole steps of the product as it is compiled, drives
// included. What is known of its state's layout stands in simulated.cpp alone.
#pragma once

#include <memory>

#include "hal_stub/robot/advance.h"
#include "hal_stub/robot/model.h"
#include "tests/external/multibody/motion.h"

namespace pastern::multibody {

/// How a step is made: one leg after another in plain double, or as on this machine (side by side, wide); or
/// plainly the body alone, without drives, heat and pack: rotors on the diagonal, dynamics, contacts,
/// integration.
enum class Way { plain, fitted, body };

class Simulated {
 public:
  /// Throws with the model's one line when the simulated robot cannot be it. Without the drives' own
  /// friction.
  explicit Simulated(const v1::Robot& robot);

  /// The friction of the drives as the robot file says, or none.
  void set_friction(bool on);
  /// What the product's friction is at these speeds, N m s/rad: viscous, and Coulomb over the larger of the
  /// speed and the 0.05 rad/s below which it grows linearly.
  [[nodiscard]] std::vector<double> viscosity(const Motion& motion) const;
  /// Accelerations in the first step of `drives.step_s` from `motion`; rotor and viscosity are the robot's
  /// own.
  [[nodiscard]] Accelerations accelerations(const Motion& motion, const Drives& drives, Way way);

  /// For steps on the floor.
  void place(const Motion& motion);
  void step(const std::vector<double>& torque, double step_s, Way way);
  void read(std::vector<double>& angle, std::vector<double>& speed) const;
  [[nodiscard]] int contacts() const;
  [[nodiscard]] double trunk_height_m() const { return state_.body.position.z; }
  [[nodiscard]] const stub::Model& model() const { return *model_; }

 private:
  void step_body_alone(const std::vector<double>& torque, double step_s);

  std::shared_ptr<const stub::Model> model_;
  stub::Stepper stepper_;
  stub::SiteFigures<double> site_{};
  stub::Told<double> told_{};
  stub::RobotState<double> state_{};
  stub::RobotWork<double> work_{};
};

}  // namespace pastern::multibody
