// Legs as chains of joints: where each foot touches, how it moves against the trunk, how hard it is pressed
// on the ground. Trunk (body) frame, SI units. Cycle thread; fixed sizes, no heap.
#pragma once

#include <Eigen/Core>
#include <array>

#include "pastern/v1/robot.pb.h"
#include "safety/frames.h"
#include "safety/limits.h"

namespace pastern::estimate {

inline constexpr int kMostLegs = safety::kMaxLegs;
inline constexpr int kMostLegJoints = safety::kMaxLegJoints;

/// Proximal joint first. Parents of a leg's joints that are in no leg (a waist) belong to the chain too.
struct LegGeometry {
  int joint_count{0};
  std::array<int, kMostLegJoints> joint{};                 ///< index in the joint order
  std::array<Eigen::Vector3d, kMostLegJoints> origin_m{};  ///< in the parent link's frame
  std::array<Eigen::Vector3d, kMostLegJoints> axis{};      ///< unit vector, in the parent link's frame
  std::array<bool, kMostLegJoints> slides{};
  Eigen::Vector3d foot_m{Eigen::Vector3d::Zero()};  ///< centre of the foot's sphere in the last link's frame
  double foot_radius_m{0};
};

struct Legs {
  int count{0};
  std::array<LegGeometry, kMostLegs> leg{};
};
[[nodiscard]] Legs legs_of(const v1::Robot& robot);  // a checked robot

using LegJacobian = Eigen::Matrix<double, 3, kMostLegJoints>;

/// Of the point of a foot that touches level ground.
struct FootState {
  Eigen::Vector3d at_m{Eigen::Vector3d::Zero()};
  Eigen::Vector3d velocity_m_s{Eigen::Vector3d::Zero()};  ///< of that point of the shank, against the trunk
  double push_n{0};  ///< force on the ground, downward positive, that the measured torques speak of
};

/// `up`: the world's vertical in the body frame.
[[nodiscard]] FootState foot_state(const LegGeometry& leg, const safety::SensorFrame& frame,
                                   const Eigen::Vector3d& up) noexcept;

}  // namespace pastern::estimate
