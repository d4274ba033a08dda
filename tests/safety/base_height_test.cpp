// Trunk height against the closed form of a two-link leg and plain trigonometry.
#include "safety/base_height.h"

#include <gtest/gtest.h>

#include <cmath>

#include "tests/safety/fixture.h"

namespace pastern::safety {
namespace {

using Up = Vector3<Metre, Body>;

TEST(BaseHeight, OfATwoLinkLegIsTheSumOfItsLinksProjections) {
  const Limits limits = test::some_limits();
  for (const double hip : {-0.9, -0.3, 0.0, 0.75, 1.2}) {
    for (const double knee : {-2.2, -1.5, -0.4, 0.0, 0.6}) {
      JointAngles<> angle;
      angle[0] = hip;
      angle[1] = knee;
      // Turning about +y by a takes (0, 0, -l) to (-l sin a, 0, -l cos a).
      const double expected = 0.25 * std::cos(hip) + 0.25 * std::cos(hip + knee);
      EXPECT_NEAR(base_height(limits, angle, Up{0.0, 0.0, 1.0}), expected, 1e-14);
      const auto foot = foot_in_body(limits.leg[0], angle);
      EXPECT_NEAR(foot.x, -0.25 * std::sin(hip) - 0.25 * std::sin(hip + knee), 1e-14);
      EXPECT_NEAR(foot.y, 0.0, 1e-14);
    }
  }
}

TEST(BaseHeight, IsVerticalAlsoWhenTheTrunkLeans) {
  Limits limits = test::some_limits();
  limits.leg[0].origin[0] = {0.2, 0.1, -0.05};
  const JointAngles<> angle;  // foot at (0.2, 0.1, -0.55)
  const double roll = 0.3;
  const double pitch = -0.2;
  const Up up{-std::sin(pitch), std::cos(pitch) * std::sin(roll), std::cos(pitch) * std::cos(roll)};
  EXPECT_NEAR(base_height(limits, angle, up), -(0.2 * up.x + 0.1 * up.y - 0.55 * up.z), 1e-14);
}

TEST(BaseHeight, AbductionSwingsTheLegSideways) {
  Limits limits = test::some_limits();
  LegChain& leg = limits.leg[0];
  leg.joint_count = 3;
  leg.joint = {2, 0, 1, 0};
  leg.origin = {Up{0.0, 0.0, 0.0}, Up{0.0, 0.07, 0.0}, Up{0.0, 0.0, -0.25}, Up{}};
  leg.axis = {Up{1.0, 0.0, 0.0}, Up{0.0, 1.0, 0.0}, Up{0.0, 1.0, 0.0}, Up{}};
  JointAngles<> angle;
  angle[2] = 0.4;
  const auto foot = foot_in_body(leg, angle);
  EXPECT_NEAR(foot.y, 0.07 * std::cos(0.4) + 0.5 * std::sin(0.4), 1e-14);
  EXPECT_NEAR(foot.z, 0.07 * std::sin(0.4) - 0.5 * std::cos(0.4), 1e-14);
}

TEST(BaseHeight, AHingeOfAnyAxisTurnsTheFootByItsQuaternion) {
  // Rotation vector (.1, .2, .3): q = (.982550982155, .049708843325, .099417686650, .149126529975) (SciPy
  // 1.10.1); the foot by the quaternion's matrix.
  Limits limits = test::some_limits();
  LegChain& leg = limits.leg[0];
  leg.joint_count = 1;
  const double size = std::sqrt(0.14);
  leg.axis[0] = {0.1 / size, 0.2 / size, 0.3 / size};
  leg.foot = {0.3, -0.2, -0.5};
  JointAngles<> angle;
  angle[0] = size;
  const double w = .982550982155;
  const double x = .049708843325;
  const double y = .099417686650;
  const double z = .149126529975;
  const auto foot = foot_in_body(leg, angle);
  EXPECT_NEAR(foot.x, 0.3 * (1 - 2 * (y * y + z * z)) - 0.2 * 2 * (x * y - w * z) - 0.5 * 2 * (x * z + w * y),
              1e-11);
  EXPECT_NEAR(foot.y, 0.3 * 2 * (x * y + w * z) - 0.2 * (1 - 2 * (x * x + z * z)) - 0.5 * 2 * (y * z - w * x),
              1e-11);
  EXPECT_NEAR(foot.z, 0.3 * 2 * (x * z - w * y) - 0.2 * 2 * (y * z + w * x) - 0.5 * (1 - 2 * (x * x + y * y)),
              1e-11);
}

TEST(BaseHeight, TheLowestFootCounts) {
  Limits limits = test::some_limits(4);
  limits.leg_count = 2;
  limits.leg[1] = test::two_link_leg();
  limits.leg[1].joint = {2, 3, 0, 0};
  JointAngles<> angle;
  angle[0] = 1.0;
  EXPECT_NEAR(base_height(limits, angle, Up{0.0, 0.0, 1.0}), 0.5, 1e-14);
}

TEST(BaseHeight, WhatIsNotKnownCountsAsLow) {
  Limits limits = test::some_limits();
  JointAngles<> angle;
  angle[1] = test::kNan;
  EXPECT_FALSE(base_height(limits, angle, Up{0.0, 0.0, 1.0}) >= limits.base_low_m);
  angle[1] = 0.0;
  limits.leg[0].joint[1] = kMaxJoints;  // an index that no checked robot file gives
  EXPECT_FALSE(base_height(limits, angle, Up{0.0, 0.0, 1.0}) >= limits.base_low_m);
  limits.leg_count = 0;
  EXPECT_FALSE(base_height(limits, angle, Up{0.0, 0.0, 1.0}) >= limits.base_low_m);
}

}  // namespace
}  // namespace pastern::safety
