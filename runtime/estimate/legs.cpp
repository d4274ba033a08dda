// Forward kinematics, Jacobian and force of a leg.
#include "runtime/estimate/legs.h"

#include <Eigen/Cholesky>
#include <Eigen/Geometry>
#include <algorithm>
#include <string>
#include <vector>

#include "proto/files/geometry.h"

namespace pastern::estimate {

namespace {

// Regularises J J^T, m^2: a direction in which the foot moves less than this for a radian carries no torque
// that could be measured (a straight leg; the sideways direction of a leg without abduction).
constexpr double kLeastArm = 0.015;

Eigen::Vector3d vector(const v1::Xyz& xyz) { return {xyz.x(), xyz.y(), xyz.z()}; }

LegGeometry leg_of(const v1::Robot& robot, const v1::Leg& leg) {
  std::vector<int> chain;
  for (std::string name = leg.knee(); !name.empty();) {
    const int index = files::find_joint(robot, name);
    chain.insert(chain.begin(), index);
    name = robot.joints(index).parent();
  }
  LegGeometry out;
  // A chain longer than the gate can hold is refused with the robot file; here the joints next to the foot
  // count.
  const std::size_t most = kMostLegJoints;
  const std::size_t skipped = chain.size() > most ? chain.size() - most : 0;
  for (std::size_t i = skipped; i < chain.size(); ++i) {
    const v1::Joint& joint = robot.joints(chain[i]);
    const auto at = static_cast<std::size_t>(out.joint_count++);
    out.joint[at] = chain[i];
    out.origin_m[at] = vector(joint.origin_m());
    out.axis[at] = vector(joint.axis()).normalized();
    out.slides[at] = joint.kind() == v1::Joint::PRISMATIC;
  }
  out.foot_m = vector(leg.foot_m());
  out.foot_radius_m = leg.foot_radius_m();
  return out;
}

/// Joint positions and axes in the trunk frame at the frame's angles, and the foot's centre.
struct Chain {
  std::array<Eigen::Vector3d, kMostLegJoints> origin;
  std::array<Eigen::Vector3d, kMostLegJoints> axis;
  Eigen::Vector3d foot{Eigen::Vector3d::Zero()};
};

Chain chain_of(const LegGeometry& leg, const safety::SensorFrame& frame) noexcept {
  Chain chain;
  Eigen::Matrix3d turn = Eigen::Matrix3d::Identity();
  Eigen::Vector3d at = Eigen::Vector3d::Zero();
  for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
    const double value = frame.angle[leg.joint[i]];
    at += turn * leg.origin_m[i];
    chain.origin[i] = at;
    chain.axis[i] = turn * leg.axis[i];
    if (leg.slides[i]) {
      at += chain.axis[i] * value;
    } else {
      turn = turn * Eigen::AngleAxisd(value, leg.axis[i]).toRotationMatrix();
    }
  }
  chain.foot = at + turn * leg.foot_m;
  return chain;
}

}  // namespace

Legs legs_of(const v1::Robot& robot) {
  Legs legs;
  for (const v1::Leg& leg : robot.legs()) {
    if (legs.count < kMostLegs) {
      legs.leg[static_cast<std::size_t>(legs.count++)] = leg_of(robot, leg);
    }
  }
  return legs;
}

FootState foot_state(const LegGeometry& leg, const safety::SensorFrame& frame,
                     const Eigen::Vector3d& up) noexcept {
  const Chain chain = chain_of(leg, frame);
  FootState foot;
  foot.at_m = chain.foot - leg.foot_radius_m * up;
  // J: column i = axis x (point - origin) for a hinge, axis for a slide.
  LegJacobian jacobian = LegJacobian::Zero();
  Eigen::Matrix<double, kMostLegJoints, 1> torque = Eigen::Matrix<double, kMostLegJoints, 1>::Zero();
  for (int i = 0; i < leg.joint_count; ++i) {
    const auto at = static_cast<std::size_t>(i);
    jacobian.col(i) = leg.slides[at] ? chain.axis[at] : chain.axis[at].cross(foot.at_m - chain.origin[at]);
    torque(i) = frame.torque[leg.joint[at]];
    foot.velocity_m_s += jacobian.col(i) * frame.speed[leg.joint[at]];
  }
  // Virtual work of a leg without weight: torque = J^T f, f the force on the ground; least squares for f.
  const Eigen::Matrix3d square =
      jacobian * jacobian.transpose() + kLeastArm * kLeastArm * Eigen::Matrix3d::Identity();
  const Eigen::Vector3d force = square.ldlt().solve(jacobian * torque);
  foot.push_n = -force.dot(up);
  return foot;
}

}  // namespace pastern::estimate
