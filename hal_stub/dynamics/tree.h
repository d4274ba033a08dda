// The constant model of a body: a trunk and legs, each a chain of 1 to 4 hinges. Figures in C (double, or the
// float of a lane type). Frames: a link's frame sits at its joint; at angle zero all frames are parallel to
// the trunk's.
#pragma once

#include <array>
#include <cstdint>

#include "hal_stub/dynamics/vector.h"

namespace pastern::stub {

inline constexpr int kMaxTreeLegs = 8;
inline constexpr int kMaxChain = 4;  ///< joints in a leg
inline constexpr int kTrunkCorners = 8;
inline constexpr int kPointsPerLeg = 2;  ///< the foot, and the last joint (knee)

/// Hinges about an axis of the frame are turned with fewer products.
enum class AxisKind : std::uint8_t { x, y, z, any };

template <class C>
struct LinkFigures {
  C mass{0};           ///< kg
  Vec3<C> centre{};    ///< of mass, in the link's frame, m
  Sym3<C> inertia{};   ///< about the centre of mass, link's axes, kg m2
  bool skewed{false};  ///< products of inertia are not zero
};

template <class C>
struct JointFigures {
  C sign{1};         ///< -1 when the axis points against x, y or z
  Vec3<C> axis{};    ///< unit vector in the parent's frame
  Vec3<C> origin{};  ///< in the parent's frame, m
  C angle_min{0};    ///< end stops, rad
  C angle_max{0};
  LinkFigures<C> link{};
  AxisKind kind{AxisKind::y};
  int order{0};  ///< index in the robot's joint order
};

template <class C>
struct LegFigures {
  std::array<JointFigures<C>, kMaxChain> joint{};  ///< from the trunk outward
  Vec3<C> foot{};                                  ///< centre of the foot's ball, in the last link's frame, m
  C foot_radius{0};
  C knee_radius{0};
  int joint_count{0};
  bool knee{false};  ///< the last joint's origin is a contact point as well (chains of two and more)
};

/// Stiffness and damping of end stops and gear play belong to the model, the ground's to the site.
template <class C>
struct Tree {
  int joint_count{0};
  int leg_count{0};
  std::array<LegFigures<C>, kMaxTreeLegs> leg{};
  LinkFigures<C> trunk{};
  std::array<Vec3<C>, kTrunkCorners> corner{};  ///< trunk frame, m
  Vec3<C> half_size{};
  C gravity{C(9.80665)};     ///< standard gravity (ISO 80000-3), m/s2
  C stop_stiffness{C(600)};  ///< end stops of the joints, N m/rad
  C stop_damping{C(6)};      ///< N m s/rad
};

}  // namespace pastern::stub
