// Closed forward kinematics of hinge chains.
#include "safety/base_height.h"

#include <cmath>
#include <limits>

namespace pastern::safety {
namespace {

using Point = Vector3<Metre, Body>;

/// v turned by `angle` about the unit vector k: v cos a + (k x v) sin a + k (k.v)(1 - cos a).
Point turned(const Point& v, const Point& k, double angle) noexcept {
  const double c = std::cos(angle);
  const double s = std::sin(angle);
  const double along = (k.x * v.x + k.y * v.y + k.z * v.z) * (1.0 - c);
  return {v.x * c + (k.y * v.z - k.z * v.y) * s + k.x * along,
          v.y * c + (k.z * v.x - k.x * v.z) * s + k.y * along,
          v.z * c + (k.x * v.y - k.y * v.x) * s + k.z * along};
}

int bounded(int count, int most) noexcept { return count < 0 ? 0 : (count > most ? most : count); }

}  // namespace

Point foot_in_body(const LegChain& leg, const JointAngles<>& angle) noexcept {
  Point p = leg.foot;
  for (int i = bounded(leg.joint_count, kMaxLegJoints) - 1; i >= 0; --i) {
    const auto k = static_cast<std::size_t>(i);
    const int joint = leg.joint[k];
    const bool known = joint >= 0 && joint < kMaxJoints;
    const double q = known ? angle[joint] : std::numeric_limits<double>::quiet_NaN();
    const Point swung = turned(p, leg.axis[k], q);
    p = {leg.origin[k].x + swung.x, leg.origin[k].y + swung.y, leg.origin[k].z + swung.z};
  }
  return p;
}

double base_height(const Limits& limits, const JointAngles<>& angle, const Point& up) noexcept {
  double highest = -std::numeric_limits<double>::infinity();
  for (int i = 0; i < bounded(limits.leg_count, kMaxLegs); ++i) {
    const Point p = foot_in_body(limits.leg[static_cast<std::size_t>(i)], angle);
    const double height = -(up.x * p.x + up.y * p.y + up.z * p.z);
    if (!(height <= highest)) highest = height;
    if (std::isnan(height)) return height;
  }
  return highest;
}

}  // namespace pastern::safety
