// Forward kinematics with plain arrays; rotations by Rodrigues' formula (rotation vector axis * angle).
#include "proto/files/geometry.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace pastern::files {
namespace {

using Rotation = std::array<Point, 3>;  // rows

struct Pose {
  Rotation turn;
  Point at;
};

Point point(const v1::Xyz& xyz) { return {xyz.x(), xyz.y(), xyz.z()}; }

Point turned(const Rotation& r, const Point& p) {
  Point out{};
  for (std::size_t i = 0; i < 3; ++i) out[i] = r[i][0] * p[0] + r[i][1] * p[1] + r[i][2] * p[2];
  return out;
}

Rotation product(const Rotation& a, const Rotation& b) {
  Rotation out{};
  for (std::size_t i = 0; i < 3; ++i) {
    for (std::size_t j = 0; j < 3; ++j) out[i][j] = a[i][0] * b[0][j] + a[i][1] * b[1][j] + a[i][2] * b[2][j];
  }
  return out;
}

// R = c 1 + s [a]x + (1 - c) a a^T
Rotation about(const Point& a, double angle) {
  const double c = std::cos(angle);
  const double s = std::sin(angle);
  const double d = 1 - c;
  return {{{c + d * a[0] * a[0], d * a[0] * a[1] - s * a[2], d * a[0] * a[2] + s * a[1]},
           {d * a[1] * a[0] + s * a[2], c + d * a[1] * a[1], d * a[1] * a[2] - s * a[0]},
           {d * a[2] * a[0] - s * a[1], d * a[2] * a[1] + s * a[0], c + d * a[2] * a[2]}}};
}

constexpr Rotation kLevel{{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}};

Point sum(const Point& a, const Point& b) { return {a[0] + b[0], a[1] + b[1], a[2] + b[2]}; }

}  // namespace

int find_joint(const v1::Robot& robot, const std::string& name) {
  for (int i = 0; i < robot.joints_size(); ++i) {
    if (robot.joints(i).name() == name) return i;
  }
  return -1;
}

std::vector<Point> feet_in_trunk(const v1::Robot& robot, const std::vector<double>& angles) {
  std::vector<Pose> poses;
  for (int i = 0; i < robot.joints_size(); ++i) {
    const v1::Joint& joint = robot.joints(i);
    const double angle = angles[static_cast<std::size_t>(i)];
    Pose base{kLevel, {0, 0, 0}};
    if (!joint.parent().empty()) base = poses[static_cast<std::size_t>(find_joint(robot, joint.parent()))];
    const Point axis = point(joint.axis());
    const bool slides = joint.kind() == v1::Joint::PRISMATIC;
    Point offset = point(joint.origin_m());
    if (slides) offset = sum(offset, {axis[0] * angle, axis[1] * angle, axis[2] * angle});
    poses.push_back({slides ? base.turn : product(base.turn, about(axis, angle)),
                     sum(base.at, turned(base.turn, offset))});
  }
  std::vector<Point> feet;
  for (const v1::Leg& leg : robot.legs()) {
    const Pose& knee = poses[static_cast<std::size_t>(find_joint(robot, leg.knee()))];
    feet.push_back(sum(knee.at, turned(knee.turn, point(leg.foot_m()))));
  }
  return feet;
}

double stance_height(const v1::Robot& robot) {
  std::vector<double> stance;
  for (const v1::Joint& joint : robot.joints()) stance.push_back(joint.stance_rad());
  const std::vector<Point> feet = feet_in_trunk(robot, stance);
  double lowest = std::numeric_limits<double>::infinity();
  for (std::size_t i = 0; i < feet.size(); ++i) {
    lowest = std::min(lowest, feet[i][2] - robot.legs(static_cast<int>(i)).foot_radius_m());
  }
  return -lowest;
}

}  // namespace pastern::files
