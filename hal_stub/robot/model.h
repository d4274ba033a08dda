// The constant part of a simulated robot, made once from a checked robot file and shared by all threads.
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "hal_stub/robot/robot_state.h"
#include "pastern/v1/robot.pb.h"

namespace pastern::stub {

class Model {
 public:
  /// Null with one line in `error` when this simulated robot cannot be it: more than 8 limbs on the trunk, or
  /// more than 8 joints in one. `robot` must have been checked (proto/files/robot_file.h). No step is longer
  /// than `longest_step_s`, above 0.
  [[nodiscard]] static std::shared_ptr<const Model> make(const v1::Robot& robot, std::string& error,
                                                         double longest_step_s = 0.001);

  [[nodiscard]] const Figures<double>& figures() const { return figures_; }
  [[nodiscard]] int joint_count() const { return joint_count_; }
  [[nodiscard]] int joint_index(const std::string& name) const;  ///< -1 when there is none
  [[nodiscard]] const std::vector<std::string>& joint_names() const { return joint_names_; }
  [[nodiscard]] const std::string& name() const { return name_; }
  [[nodiscard]] const std::vector<double>& stance() const { return stance_; }  ///< rad, joint order
  [[nodiscard]] const std::vector<double>& lying() const { return lying_; }
  /// The PD gains of the robot file, for drives that hold a stance by themselves.
  [[nodiscard]] const std::vector<double>& hold_stiffness() const { return hold_stiffness_; }
  [[nodiscard]] const std::vector<double>& hold_damping() const { return hold_damping_; }
  /// The gate's peak torque of each joint, N m: no correction of a command by the drive itself goes beyond.
  [[nodiscard]] const std::vector<double>& envelope() const { return envelope_; }
  [[nodiscard]] const v1::Sensors& sensors() const { return sensors_; }
  [[nodiscard]] const std::vector<double>& damping() const { return damping_; }  ///< of the drives, N m s/rad
  [[nodiscard]] const std::vector<double>& coulomb() const { return coulomb_; }  ///< N m
  [[nodiscard]] const std::vector<double>& gear_loss() const { return gear_loss_; }
  [[nodiscard]] const std::vector<double>& stick() const { return stick_; }  ///< N m, beyond Coulomb
  /// Some drive's current or heat, or the pack's current, is limited.
  [[nodiscard]] bool limited() const { return limited_; }
  [[nodiscard]] double cold_ratio() const { return cold_ratio_; }  ///< pack's resistance, -20 over 25 deg C
  [[nodiscard]] const std::vector<int>& shanks() const { return shanks_; }  ///< joints that move them
  [[nodiscard]] double period_s() const { return period_s_; }               ///< of the cycle
  [[nodiscard]] int substeps() const { return substeps_; }  ///< steps of at most the longest in a period
  [[nodiscard]] double drive_timeout_s() const { return drive_timeout_s_; }
  [[nodiscard]] double rise_s() const { return rise_s_; }  ///< from lying until a walk may begin
  [[nodiscard]] double mass_kg() const { return mass_kg_; }
  [[nodiscard]] double stance_height_m() const {
    return stance_height_m_;
  }  ///< of the trunk's origin over ground
  /// Same bytes for the same robot: guards a saved state.
  [[nodiscard]] const std::string& digest() const { return digest_; }

 private:
  Model() = default;
  void take_drives(const v1::Robot& robot);

  Figures<double> figures_;
  int joint_count_{0};
  std::string name_;
  std::vector<std::string> joint_names_;
  std::vector<double> stance_;
  std::vector<double> lying_;
  std::vector<double> damping_;
  std::vector<double> coulomb_;
  std::vector<double> gear_loss_;
  std::vector<double> stick_;
  bool limited_{false};
  double cold_ratio_{1};
  std::vector<int> shanks_;
  std::vector<double> hold_stiffness_;
  std::vector<double> hold_damping_;
  std::vector<double> envelope_;
  v1::Sensors sensors_;
  double period_s_{0.001};
  int substeps_{1};
  double drive_timeout_s_{0.02};
  double rise_s_{0};
  double mass_kg_{0};
  double stance_height_m_{0};
  std::string digest_;
};

/// Place of a limb's first foot (centre of its ball) in trunk axes for given joint angles in joint order.
[[nodiscard]] Vec3<double> foot_place(const Tree<double>& tree, int leg, const double* angle);
/// How far the lowest contact point lies under the trunk's origin along `down` (unit, trunk axes).
[[nodiscard]] double reach_below(const Tree<double>& tree, const double* angle, const Vec3<double>& down);

/// Height of the trunk's origin over the plane of any ground, along its normal, at which the first contact
/// point touches, the trunk over the start mark; `attitude` trunk to world.
[[nodiscard]] double rest_height(const Tree<double>& tree, const double* angle, const Quat<double>& attitude,
                                 const Ground<double>& ground);

}  // namespace pastern::stub
