// The beginnings of a robot file say the same body as the URDF did: masses, centres and moments at angle
// zero, worked out here link by link with the rotations of URDF's roll, pitch and yaw (its specification:
// fixed axes x, y, z).
#include <Eigen/Dense>
#include <algorithm>
#include <cmath>

#include "tests/tools/urdf/stilt.h"

namespace pastern::testing {
namespace {

using Eigen::Isometry3d;
using Eigen::Matrix3d;
using Eigen::Vector3d;

Isometry3d pose(double x, double y, double z, double roll, double pitch, double yaw) {
  Isometry3d made = Isometry3d::Identity();
  made.translation() = Vector3d(x, y, z);
  made.linear() = (Eigen::AngleAxisd(yaw, Vector3d::UnitZ()) * Eigen::AngleAxisd(pitch, Vector3d::UnitY()) *
                   Eigen::AngleAxisd(roll, Vector3d::UnitX()))
                      .toRotationMatrix();
  return made;
}

tools::UrdfRobot made_of(const std::string& text) {
  files::Defects defects;
  const auto made = tools::parse_urdf(text, "stilt.urdf", defects);
  EXPECT_TRUE(made) << files::lines(defects);
  return made.value_or(tools::UrdfRobot{});
}

Vector3d vec(const v1::Xyz& a) { return {a.x(), a.y(), a.z()}; }

Matrix3d inertia(double xx, double yy, double zz, double xy, double xz, double yz) {
  Matrix3d made;
  made << xx, xy, xz, xy, yy, yz, xz, yz, zz;
  return made;
}
Matrix3d inertia(const v1::Inertia& i) { return inertia(i.xx(), i.yy(), i.zz(), i.xy(), i.xz(), i.yz()); }

const v1::Joint& joint(const v1::Robot& robot, const std::string& name) {
  for (const v1::Joint& one : robot.joints()) {
    if (one.name() == name) return one;
  }
  ADD_FAILURE() << name;
  return robot.joints(0);
}

const Isometry3d kHip = pose(0.15, 0.1, 0, 0.4, 0.1, -0.3);  // of stilt()
const Isometry3d kMast = pose(-0.1, 0, 0.05, 0.3, -0.2, 0.1);

TEST(UrdfSkeleton, JointsStandInOrderWithParentsAndKinds) {
  const auto made = made_of(stilt());
  ASSERT_EQ(made.robot.joints_size(), 4);
  EXPECT_EQ(made.robot.name(), "stilt");
  EXPECT_EQ(made.links, 7);
  EXPECT_DOUBLE_EQ(made.mass_kg, 7.4);
  const auto& joints = made.robot.joints();
  for (int j = 0; j < joints.size(); ++j) {
    const std::string& parent = joints[j].parent();
    const auto before = std::find_if(joints.begin(), joints.begin() + j,
                                     [&](const v1::Joint& o) { return o.name() == parent; });
    EXPECT_TRUE(parent.empty() || before != joints.begin() + j) << joints[j].name();
  }
  EXPECT_EQ(joint(made.robot, "left_knee").parent(), "left_hip");
  EXPECT_EQ(joint(made.robot, "tail_slide").parent(), "");  // the mast is part of the trunk
  EXPECT_EQ(joint(made.robot, "tail_slide").kind(), v1::Joint::PRISMATIC);
  EXPECT_EQ(joint(made.robot, "left_knee").kind(), v1::Joint::HINGE);
}

TEST(UrdfSkeleton, AxesAndOriginsAreThoseOfTheTrunkAtAngleZero) {
  const auto made = made_of(stilt());
  EXPECT_LT((vec(joint(made.robot, "left_hip").origin_m()) - kHip.translation()).norm(), 1e-15);
  EXPECT_LT((vec(joint(made.robot, "left_hip").axis()) - kHip.linear() * Vector3d(0, 1, 0)).norm(), 1e-14);
  const Isometry3d knee = kHip * pose(0, 0, -0.22, 0, 0, 1.2);
  EXPECT_LT((vec(joint(made.robot, "left_knee").origin_m()) - kHip.linear() * Vector3d(0, 0, -0.22)).norm(),
            1e-14);
  EXPECT_LT(
      (vec(joint(made.robot, "left_knee").axis()) - knee.linear() * Vector3d(1, 1, 0).normalized()).norm(),
      1e-14);
  const Isometry3d tail = kMast * pose(0, 0, 0.1, 0, 0.5, 0);
  EXPECT_LT((vec(joint(made.robot, "tail_slide").origin_m()) - tail.translation()).norm(), 1e-14);
  EXPECT_EQ(joint(made.robot, "right_hip").axis().x(), 0);  // exactly along y
  EXPECT_EQ(joint(made.robot, "right_hip").axis().y(), 1);
}

TEST(UrdfSkeleton, LinksAreTurnedAndFixedOnesMerged) {
  const auto made = made_of(stilt());
  const auto& thigh = joint(made.robot, "left_hip").link();
  const Isometry3d at = kHip * pose(0.02, 0, -0.1, 0.1, 0.2, 0.3);
  EXPECT_DOUBLE_EQ(thigh.mass_kg(), 0.8);
  EXPECT_LT((vec(thigh.centre_of_mass_m()) - (at.translation() - kHip.translation())).norm(), 1e-14);
  const Matrix3d turned =
      at.linear() * inertia(0.004, 0.0042, 0.0009, 0.0001, 0, 0) * at.linear().transpose();
  EXPECT_LT((inertia(thigh.inertia()) - turned).norm(), 1e-15);

  const Isometry3d mast = kMast * pose(0, 0, 0.1, 0, 0, 0.5);
  const Vector3d centre = (4 * Vector3d(0.01, 0, 0.02) + mast.translation()) / 5;
  const auto moved = [&](double mass, const Vector3d& from) {
    const Vector3d d = from - centre;
    return Matrix3d(mass * (d.squaredNorm() * Matrix3d::Identity() - d * d.transpose()));
  };
  const Matrix3d both = inertia(0.03, 0.05, 0.06, 0.001, 0, -0.002) + moved(4, Vector3d(0.01, 0, 0.02)) +
                        mast.linear() * inertia(0.004, 0.005, 0.002, 0, 0, 0) * mast.linear().transpose() +
                        moved(1, mast.translation());
  const auto& trunk = made.robot.trunk().link();
  EXPECT_DOUBLE_EQ(trunk.mass_kg(), 5);
  EXPECT_LT((vec(trunk.centre_of_mass_m()) - centre).norm(), 1e-15);
  EXPECT_LT((inertia(trunk.inertia()) - both).norm(), 1e-15);
}

TEST(UrdfSkeleton, MergedLinksKeepTheirPlace) {
  const auto made = made_of(stilt());
  ASSERT_EQ(made.merged.size(), 2U);
  const auto foot = std::find_if(made.merged.begin(), made.merged.end(),
                                 [](const auto& m) { return m.name == "left_foot"; });
  ASSERT_NE(foot, made.merged.end());
  EXPECT_EQ(foot->joint, "left_knee");
  const Isometry3d knee = kHip * pose(0, 0, -0.22, 0, 0, 1.2);
  const Vector3d place = knee.linear() * Vector3d(0, 0, -0.21);
  EXPECT_LT((Vector3d(foot->place_m[0], foot->place_m[1], foot->place_m[2]) - place).norm(), 1e-14);
}

TEST(UrdfSkeleton, LimitsAndFrictionAreTakenAndTheRestIsStillMissing) {
  const auto made = made_of(stilt());
  const auto& hip = joint(made.robot, "left_hip");
  EXPECT_EQ(hip.angle_min_rad(), -1);
  EXPECT_EQ(hip.angle_max_rad(), 2);
  EXPECT_EQ(hip.drive().peak_torque_nm(), 30);
  EXPECT_EQ(hip.guard().speed_max_rad_per_s(), 12);
  EXPECT_EQ(hip.drive().damping_nm_s_per_rad(), 0.1);
  EXPECT_EQ(hip.drive().coulomb_nm(), 0.3);
  EXPECT_FALSE(joint(made.robot, "left_knee").has_drive());
  const auto missing = [&](const std::string& field) {
    return std::count(made.still_missing.begin(), made.still_missing.end(), field) == 1;
  };
  EXPECT_TRUE(missing("joints[].stance_rad (4 joints)"));
  EXPECT_TRUE(missing("joints[].drive (1 joint)"));
  EXPECT_TRUE(missing("joints[].drive.rotor_inertia_kg_m2 (3 joints)"));
  for (const char* whole : {"pack", "sensors", "guard", "legs", "trunk.size_m"})
    EXPECT_TRUE(missing(whole)) << whole;
  for (const std::string& field : made.still_missing) {
    EXPECT_EQ(field.find("mass"), std::string::npos) << field;
    EXPECT_EQ(field.find("axis"), std::string::npos) << field;
  }
}

}  // namespace
}  // namespace pastern::testing
