// Robot file -> limbs.
#include "hal_stub/robot/limbs.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "hal_stub/dynamics/motion.h"

namespace pastern::stub {
namespace {

constexpr double kJointRadius = 0.02;  // m, of the ball about a joint

Vec3<double> vec(const v1::Xyz& a) { return {a.x(), a.y(), a.z()}; }

JointFigures<double> joint_of(const v1::Joint& joint, int order) {
  JointFigures<double> made;
  made.axis = vec(joint.axis());
  made.origin = vec(joint.origin_m());
  made.angle_min = joint.angle_min_rad();
  made.angle_max = joint.angle_max_rad();
  made.order = order;
  made.slides = joint.kind() == v1::Joint::PRISMATIC;
  made.link = link_of(joint.link());
  const double along[3] = {made.axis.x, made.axis.y, made.axis.z};
  made.kind = AxisKind::any;
  for (int k = 0; k < 3; ++k) {
    if (std::fabs(std::fabs(along[k]) - 1) < 1e-12) {
      made.kind = static_cast<AxisKind>(k);
      made.sign = along[k] > 0 ? 1 : -1;
    }
  }
  return made;
}

/// The robot's joints by index: who carries whom.
class Family {
 public:
  explicit Family(const v1::Robot& robot) : robot_(robot), parent_(size(), -1), children_(size(), 0) {
    for (std::size_t j = 0; j < size(); ++j) {
      for (std::size_t k = 0; k < size(); ++k) {
        if (at(k).name() == at(j).parent()) parent_[j] = static_cast<int>(k);
      }
      if (parent_[j] >= 0) ++children_[static_cast<std::size_t>(parent_[j])];
    }
  }
  [[nodiscard]] std::size_t size() const { return static_cast<std::size_t>(robot_.joints_size()); }
  [[nodiscard]] const v1::Joint& at(std::size_t j) const { return robot_.joints(static_cast<int>(j)); }
  [[nodiscard]] int parent(std::size_t j) const { return parent_[j]; }
  [[nodiscard]] int children(std::size_t j) const { return children_[j]; }
  /// The joint on the trunk that bears it in the end. Parents come before children in a checked file.
  [[nodiscard]] std::size_t root(std::size_t j) const {
    while (parent_[j] >= 0) j = static_cast<std::size_t>(parent_[j]);
    return j;
  }
  [[nodiscard]] std::vector<std::size_t> limb(std::size_t root_joint) const {
    std::vector<std::size_t> found;
    for (std::size_t j = 0; j < size(); ++j) {
      if (root(j) == root_joint) found.push_back(j);
    }
    return found;
  }
  /// The leg whose foot is on this joint's link, or null.
  [[nodiscard]] const v1::Leg* leg(std::size_t j) const {
    for (const auto& leg : robot_.legs()) {
      if (leg.knee() == at(j).name()) return &leg;
    }
    return nullptr;
  }

 private:
  const v1::Robot& robot_;
  std::vector<int> parent_;
  std::vector<int> children_;
};

/// A chain of hinges with no more to touch the ground than its end and its last joint.
bool is_simple(const Family& family, const std::vector<std::size_t>& joints) {
  if (joints.size() > kMaxChain) return false;
  for (std::size_t i = 0; i < joints.size(); ++i) {
    const std::size_t j = joints[i];
    if (family.at(j).kind() != v1::Joint::HINGE || family.children(j) > 1) return false;
    const bool end = i + 1 == joints.size();
    if (!end && (family.leg(j) != nullptr || family.at(j).has_tip_m())) return false;
  }
  return family.leg(joints.back()) != nullptr || joints.size() <= 2;
}

/// What touches the ground at the end of a link, as made; `foot` false: nothing is made to.
PointFigures<double> end_of(const Family& family, std::size_t j, int in_limb) {
  if (const v1::Leg* leg = family.leg(j)) return {vec(leg->foot_m()), leg->foot_radius_m(), in_limb, true};
  const v1::Joint& joint = family.at(j);
  if (joint.has_tip_m()) return {vec(joint.tip_m()), joint.tip_radius_m(), in_limb, true};
  return {vec(joint.link().centre_of_mass_m()), 0, in_limb, false};
}

void add_points(const Family& family, const std::vector<std::size_t>& joints, LegFigures<double>& limb) {
  const auto add = [&](const PointFigures<double>& point) {
    limb.point[static_cast<std::size_t>(limb.point_count++)] = point;
  };
  for (const bool feet : {true, false}) {
    for (std::size_t i = 0; i < joints.size(); ++i) {
      const PointFigures<double> end = end_of(family, joints[i], static_cast<int>(i));
      const bool ends = end.foot || family.children(joints[i]) == 0;
      if (ends && end.foot == feet) add(end);
    }
  }
  for (std::size_t i = 0; i < joints.size(); ++i) {
    if (limb.joint[i].parent >= 0) add({{0, 0, 0}, kJointRadius, static_cast<int>(i), false});
  }
}

void make_limb(const Family& family, const std::vector<std::size_t>& joints, LegFigures<double>& limb) {
  limb.joint_count = static_cast<int>(joints.size());
  for (std::size_t i = 0; i < joints.size(); ++i) {
    auto& joint = limb.joint[i] = joint_of(family.at(joints[i]), static_cast<int>(joints[i]));
    joint.line = 1U << i;
    for (std::size_t k = 0; k < i; ++k) {
      if (static_cast<int>(joints[k]) != family.parent(joints[i])) continue;
      joint.parent = static_cast<int>(k);
      joint.line |= limb.joint[k].line;
    }
  }
  const PointFigures<double> end = end_of(family, joints.back(), limb.joint_count - 1);
  limb.foot = end.at;
  limb.foot_radius = end.radius;
  limb.stands = end.foot;
  limb.knee = joints.size() > 1;
  limb.knee_radius = kJointRadius;
  limb.general = !is_simple(family, joints);
  if (limb.general) add_points(family, joints, limb);
}

/// Axes and origins of the links of a limb in trunk axes.
struct Pose {
  std::array<Rotation<double>, kMaxLimb> axes;
  std::array<Vec3<double>, kMaxLimb> place;
};

Pose pose_of(const LegFigures<double>& limb, const double* angle) {
  Pose pose{};
  const Rotation<double> level{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}};
  for (std::size_t i = 0; i < static_cast<std::size_t>(limb.joint_count); ++i) {
    const auto& joint = limb.joint[i];
    const auto before = static_cast<std::size_t>(std::max(joint.parent, 0));
    const Rotation<double>& base = joint.parent < 0 ? level : pose.axes[before];
    const Vec3<double> from = joint.parent < 0 ? Vec3<double>{0, 0, 0} : pose.place[before];
    const double q = angle[joint.order];
    pose.place[i] = from + turn(base, joint.origin);
    pose.axes[i] = base;
    if (joint.slides) {
      pose.place[i] = pose.place[i] + turn(base, joint.axis) * q;
    } else {
      pose.axes[i] = turned(base, joint, sin_cos(q));
    }
  }
  return pose;
}

}  // namespace

LinkFigures<double> link_of(const v1::Link& link) {
  const auto& i = link.inertia();
  LinkFigures<double> made;
  made.mass = link.mass_kg();
  made.centre = vec(link.centre_of_mass_m());
  made.inertia = {i.xx(), i.yy(), i.zz(), i.xy(), i.xz(), i.yz()};
  made.skewed = i.xy() != 0 || i.xz() != 0 || i.yz() != 0;
  return made;
}

bool take_limbs(const v1::Robot& robot, Tree<double>& tree, std::string& error) {
  const Family family(robot);
  std::vector<bool> taken(family.size(), false);
  for (std::size_t tip = 0; tip < family.size(); ++tip) {
    const std::size_t root = family.root(tip);
    if (family.children(tip) > 0 || taken[root]) continue;
    taken[root] = true;
    if (tree.leg_count == kMaxTreeLegs) {
      error = "joints: found more than 8 limbs on the trunk, expected at most 8";
      return false;
    }
    const std::vector<std::size_t> joints = family.limb(root);
    if (joints.size() > kMaxLimb) {
      error = family.at(root).name() + ": found a limb of " + std::to_string(joints.size()) +
              " joints from here outward, expected at most 8";
      return false;
    }
    make_limb(family, joints, tree.leg[static_cast<std::size_t>(tree.leg_count++)]);
  }
  return true;
}

void for_points(const LegFigures<double>& limb, const double* angle,
                const std::function<void(const Vec3<double>& place, double radius)>& f) {
  const Pose pose = pose_of(limb, angle);
  if (!limb.general) {
    const auto last = static_cast<std::size_t>(limb.joint_count - 1);
    f(pose.place[last] + turn(pose.axes[last], limb.foot), limb.foot_radius);
    if (limb.knee) f(pose.place[last], limb.knee_radius);
    return;
  }
  for (std::size_t p = 0; p < static_cast<std::size_t>(limb.point_count); ++p) {
    const auto& point = limb.point[p];
    const auto j = static_cast<std::size_t>(point.joint);
    f(pose.place[j] + turn(pose.axes[j], point.at), point.radius);
  }
}

}  // namespace pastern::stub
