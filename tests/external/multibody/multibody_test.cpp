// Accelerations of the simulated robot against DART 6.12.1 (Debian's libdart-dev), an independent
// implementation of articulated bodies (Featherstone, Rigid Body Dynamics Algorithms, 2008). Bar 1e-10: both
// sides solve the same linear system in double; its condition number, up to some 1e4 for these bodies, times
// 1e-16, times some dozen operations.
#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "tests/external/multibody/comparison.h"
#include "tests/external/multibody/reference.h"
#include "tests/external/multibody/simulated.h"

namespace pastern::multibody {
namespace {

constexpr double kBar = 1e-10;

class EachShape : public ::testing::TestWithParam<std::size_t> {
 protected:
  const Shape& shape() const { return shapes().at(GetParam()); }
};

TEST_P(EachShape, AcceleratesAsTheReferenceWithoutFriction) {
  const Compared c = compare(shape(), false, 100, 10, 1);
  EXPECT_EQ(c.states, 100);
  EXPECT_LE(c.worst, kBar) << shape().name << "; the reference against itself: " << c.reference;
}

TEST_P(EachShape, AcceleratesAsTheReferenceWithRotorsAndFriction) {
  const Compared c = compare(shape(), true, 100, 10, 2);
  EXPECT_LE(c.worst, kBar) << shape().name << "; the reference against itself: " << c.reference;
}

INSTANTIATE_TEST_SUITE_P(Shapes, EachShape, ::testing::Range<std::size_t>(0, shapes().size()));

struct Pair {
  v1::Robot robot;
  Motion motion;
  Drives drives;
};

Pair dunlin() {
  Pair p{shipped("dunlin12"), {}, {}};
  unlimit(p.robot);
  Lot lot(3);
  p.motion = drawn_motion(lot, p.robot);
  for (const auto& joint : p.robot.joints()) {
    p.drives.torque.push_back(lot.between(-30, 30));
    p.drives.rotor.push_back(joint.drive().rotor_inertia_kg_m2());
    p.drives.viscosity.push_back(0);
  }
  return p;
}

/// What the comparison says of one figure changed on the simulated side only.
double told_apart(const std::function<void(v1::Robot&)>& change) {
  const Pair p = dunlin();
  v1::Robot changed = p.robot;
  change(changed);
  Simulated simulated(changed);
  Reference reference(p.robot);
  return difference(simulated.accelerations(p.motion, p.drives, Way::fitted),
                    reference.by_recursion(p.motion, p.drives));
}

TEST(Comparison, SeesAPartInAMillionOfEveryFigureOfALink) {
  EXPECT_LE(told_apart([](v1::Robot&) {}), kBar);
  const auto sees = [](const char* what, const std::function<void(v1::Joint&)>& change) {
    EXPECT_GT(told_apart([&](v1::Robot& r) { change(*r.mutable_joints(4)); }), 10 * kBar) << what;
  };
  const double k = 1 + 1e-6;
  sees("mass", [k](v1::Joint& j) { j.mutable_link()->set_mass_kg(j.link().mass_kg() * k); });
  sees("centre", [k](v1::Joint& j) {
    j.mutable_link()->mutable_centre_of_mass_m()->set_z(j.link().centre_of_mass_m().z() * k);
  });
  sees("inertia",
       [k](v1::Joint& j) { j.mutable_link()->mutable_inertia()->set_xx(j.link().inertia().xx() * k); });
  sees("product", [](v1::Joint& j) { j.mutable_link()->mutable_inertia()->set_xy(1e-8); });
  sees("origin", [k](v1::Joint& j) { j.mutable_origin_m()->set_y(j.origin_m().y() * k); });
  sees("rotor", [k](v1::Joint& j) {
    j.mutable_drive()->set_rotor_inertia_kg_m2(j.drive().rotor_inertia_kg_m2() * k);
  });
}

TEST(Comparison, ANumberThatIsNotFiniteIsNoAgreement) {
  Accelerations sound{{1, 2, 3, 4, 5, 6}, {7}};
  Accelerations broken = sound;
  broken.joint[0] = std::numeric_limits<double>::quiet_NaN();
  EXPECT_EQ(difference(sound, sound), 0);
  EXPECT_FALSE(difference(broken, sound) <= kBar);
  EXPECT_FALSE(difference(sound, broken) <= kBar);
}

TEST(Reference, SlidingAndBranchingTreesAgreeBetweenItsOwnTwoWays) {
  Pair p = dunlin();
  p.robot.mutable_joints(2)->set_kind(v1::Joint::PRISMATIC);
  p.robot.mutable_joints(5)->set_parent(p.robot.joints(3).name());
  Reference reference(p.robot);
  const Accelerations a = reference.by_recursion(p.motion, p.drives);
  EXPECT_LE(difference(reference.by_mass_matrix(p.motion, p.drives), a), kBar);
  EXPECT_GT(difference(Reference(dunlin().robot).by_recursion(p.motion, p.drives), a), 0.01);
}

/// What the simulated robot does not take yet must be in order here, so that a new kind is one more shape.
TEST(Reference, DrawnTreesThatSlideAndBranchAgreeBetweenItsOwnTwoWays) {
  Lot lot(4);
  int sliding = 0;
  int branches = 0;
  for (int k = 0; k < 50; ++k) {
    const v1::Robot robot = drawn_robot(lot, {.legs = lot.whole(1, 6), .sliding = 0.3, .branching = 0.3});
    EXPECT_LE(robot.joints_size(), 32);
    const Motion motion = drawn_motion(lot, robot);
    Drives drives;
    for (const auto& joint : robot.joints()) {
      sliding += joint.kind() == v1::Joint::PRISMATIC ? 1 : 0;
      branches += joint.name().find("side") != std::string::npos ? 1 : 0;
      drives.torque.push_back(lot.between(-30, 30));
      drives.rotor.push_back(joint.drive().rotor_inertia_kg_m2());
      drives.viscosity.push_back(joint.drive().damping_nm_s_per_rad());
    }
    Reference reference(robot);
    EXPECT_LE(difference(reference.by_mass_matrix(motion, drives), reference.by_recursion(motion, drives)),
              kBar);
  }
  EXPECT_GT(sliding, 50);
  EXPECT_GT(branches, 50);
}

}  // namespace
}  // namespace pastern::multibody
