// Gains from the robot file; the PD law for the robot's own scalar.
#include "runtime/control/pd.h"

namespace pastern::control {

Gains<double> gains_of(const v1::Robot& robot) {
  Gains<double> gains;
  gains.joint_count = robot.joints_size();
  for (int j = 0; j < robot.joints_size(); ++j) {
    const auto i = static_cast<std::size_t>(j);
    gains.stiffness[i] = robot.joints(j).stiffness_nm_per_rad();
    gains.damping[i] = robot.joints(j).damping_nm_s_per_rad();
  }
  return gains;
}

template Torques<double> pd_torques(const Gains<double>&, const JointTarget<double>&,
                                    const JointAngles<double>&, const JointSpeeds<double>&) noexcept;

}  // namespace pastern::control
