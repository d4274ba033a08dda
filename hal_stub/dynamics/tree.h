// The constant model of a body: a trunk and limbs, each a chain of 1 to 4 hinges, or of the general kind: up
// to 8 joints that turn or slide, and may branch. Figures in C (double, or the float of a lane type). Frames:
// a link's frame sits at its joint; at angle zero all frames are parallel to the trunk's. A joint that slides
// has m where a hinge has rad, N where it has N m, kg where it has kg m2.
#pragma once

#include <array>
#include <cstdint>

#include "hal_stub/dynamics/vector.h"

namespace pastern::stub {

inline constexpr int kMaxTreeLegs = 8;
inline constexpr int kMaxChain = 4;    ///< joints in a limb that is a chain of hinges
inline constexpr int kMaxLimb = 8;     ///< joints in a limb of the general kind
inline constexpr int kMaxPoints = 16;  ///< contact points of a limb of the general kind
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
  // In limbs of the general kind only:
  bool slides{false};
  int parent{-1};         ///< index in the limb, before this one's; -1: the trunk
  std::uint32_t line{1};  ///< bit i: joint i of the limb lies between the trunk and this link, itself too
};

/// A ball on a link of a limb of the general kind.
template <class C>
struct PointFigures {
  Vec3<C> at{};  ///< its centre, in the link's frame, m
  C radius{0};
  int joint{0};      ///< index in the limb
  bool foot{false};  ///< made to touch the ground: no fall when it does
};

template <class C>
struct LegFigures {
  std::array<JointFigures<C>, kMaxLimb> joint{};  ///< from the trunk outward
  Vec3<C> foot{};                                 ///< centre of the foot's ball, in the last link's frame, m
  C foot_radius{0};
  C knee_radius{0};
  int joint_count{0};
  bool knee{false};   ///< the last joint's origin is a contact point as well (chains of two and more)
  bool stands{true};  ///< its foot is made to touch the ground: no fall when it does
  /// Of the general kind: foot and knee do not count but the points here, feet first.
  bool general{false};
  int point_count{0};
  std::array<PointFigures<C>, kMaxPoints> point{};
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
  C gravity{C(9.80665)};        ///< standard gravity (ISO 80000-3), m/s2
  C stop_stiffness{C(600)};     ///< end stops of the joints, N m/rad
  C stop_damping{C(6)};         ///< N m s/rad
  C slide_stiffness{C(60000)};  ///< of a slide's end stops, N/m
  C slide_damping{C(600)};      ///< N s/m
};

}  // namespace pastern::stub
