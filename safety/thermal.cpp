// The first-order law, one exact exponential a step.
#include "safety/thermal.h"

#include <cmath>

namespace pastern::safety {
namespace {

// Keeps theta finite under any input: a hundred times the rated torque is far beyond any drive.
constexpr double kMostLoad = 100.0;
constexpr double kMostTheta = kMostLoad * kMostLoad;

}  // namespace

void ThermalModel::step(int joint, double torque_nm, double rated_nm, double tau_s, double span_s) noexcept {
  const double ratio = std::fabs(torque_nm) / rated_nm;
  const double load = rated_nm > 0.0 && ratio < kMostLoad ? ratio : kMostLoad;
  const double share = -std::expm1(-span_s / tau_s);
  const double weight = tau_s > 0.0 && share >= 0.0 && share <= 1.0 ? share : 1.0;
  theta_[joint] += (load * load - theta_[joint]) * weight;
}

double ThermalModel::worst(int joint_count) const noexcept {
  double most = 0.0;
  for (int j = 0; j < joint_count; ++j) {
    if (!(theta_[j] <= most)) most = theta_[j];
  }
  return most;
}

void ThermalModel::restore(const PerJoint<Celsius>& state) noexcept {
  for (int j = 0; j < kMaxJoints; ++j) {
    const double theta = state[j];
    const bool known = theta >= 0.0 && std::isfinite(theta);
    theta_[j] = known ? (theta < kMostTheta ? theta : kMostTheta) : 1.0;
  }
}

}  // namespace pastern::safety
