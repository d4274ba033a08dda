// Trees of every kind: limbs that branch and slide against the same limb as a chain and against conservation;
// robots with six legs, with two and a tail, with a waist.
#include <google/protobuf/text_format.h>
#include <gtest/gtest.h>

#include "hal_stub/robot/start.h"
#include "tests/hal_stub/bodies.h"
#include "tests/hal_stub/robots.h"

namespace pastern::stub {
namespace {

files::RobotFile own_robot(const std::string& name) {
  files::Defects defects;
  auto file =
      files::read_robot(PASTERN_SOURCE_DIR "/tests/hal_stub/robots/" + name + ".robot.txtpb", defects);
  EXPECT_TRUE(file) << files::lines(defects);
  return *file;
}

/// The same limb of the general kind, with the same two points.
void generalise(LegFigures<double>& limb) {
  const int last = limb.joint_count - 1;
  for (int i = 0; i <= last; ++i) {
    auto& joint = limb.joint[static_cast<std::size_t>(i)];
    joint.parent = i - 1;
    joint.line = (2U << static_cast<unsigned>(i)) - 1U;
  }
  limb.general = true;
  limb.point_count = 2;
  limb.point[0] = {limb.foot, limb.foot_radius, last, true};
  limb.point[1] = {{0, 0, 0}, limb.knee_radius, last, false};
}

// The general form and the form for chains are two ways to the same step, in contact and out of it: equal but
// for rounding, which a stiff contact magnifies.
TEST(Trees, AChainSteppedAsALimbOfTheGeneralKindIsTheSame) {
  const files::RobotFile file = robot_file();
  const auto model = model_of(file);
  SimulatedRobot robot(model, nominal_site(*model), 1);
  robot.place_standing(1);
  SiteFigures<double> site = figures_of(*model, nominal_site(*model));
  site.pack.open_scale = 44;
  Figures<double> figures = model->figures();
  for (std::size_t l = 0; l < 4; ++l) {
    if (l != 2) generalise(figures.tree.leg[l]);
  }
  Holder holder(file.robot());
  for (int k = 0; k < 60; ++k) {
    if (k < 50) holder.trot(robot, 0.02, 0.2, 0.05);
    if (k >= 50) {
      for (int n = 0; n < 60; ++n) {  // and falling down
        robot.command({}, false);
        robot.step();
      }
    }
    RobotState<double> chain = robot.state();
    RobotState<double> general = robot.state();
    RobotWork<double> work{};
    step_plainly(model->figures(), site, {}, 1e-3, chain, work);
    step_plainly(figures, site, {}, 1e-3, general, work);
    EXPECT_NEAR(chain.body.velocity.z, general.body.velocity.z, 1e-11);
    EXPECT_NEAR(chain.body.rate.y, general.body.rate.y, 1e-10);
    for (std::size_t l = 0; l < 4; ++l) {
      for (std::size_t i = 0; i < 3; ++i) EXPECT_NEAR(chain.body.speed[l][i], general.body.speed[l][i], 1e-9);
      for (std::size_t p = 0; p < 2; ++p) {
        EXPECT_NEAR(chain.body.grip.leg[l][p], general.body.grip.leg[l][p], 1e-6);
      }
    }
  }
}

/// A limb that branches twice and slides twice, tumbling in the air.
struct Tumble {
  TreeD tree;
  Surroundings<double> around;
  StateD state;
  Work<double> work{};
  Loads<double> loads{};

  Tumble() {
    tree.gravity = 9.81;
    tree.trunk.mass = 5;
    tree.trunk.centre = {0.02, -0.01, 0.03};
    tree.trunk.inertia = {0.05, 0.11, 0.13, 0.004, -0.003, 0.002};
    tree.trunk.skewed = true;
    tree.joint_count = 7;
    tree.leg_count = 1;
    auto& limb = tree.leg[0];
    limb.joint_count = 7;
    limb.general = true;
    const int parent[7] = {-1, 0, 0, 1, 1, 2, 5};
    const AxisKind kind[7] = {AxisKind::z, AxisKind::y, AxisKind::x, AxisKind::y,
                              AxisKind::x, AxisKind::z, AxisKind::y};
    for (int i = 0; i < 7; ++i) {
      const auto k = static_cast<std::size_t>(i);
      const double s = 0.03 * i;
      limb.joint[k] = hinge(kind[i], {0.1 - s, 0.05 + s, -0.08}, 0.4 + 0.1 * i, {0.02, s, -0.05},
                            {0.003, 0.004, 0.002 + 0.0005 * i});
      limb.joint[k].order = i;
      limb.joint[k].parent = parent[i];
      limb.joint[k].slides = i == 2 || i == 4;
      limb.joint[k].line = 1U << k;
      if (parent[i] >= 0) limb.joint[k].line |= limb.joint[static_cast<std::size_t>(parent[i])].line;
      state.angle[0][k] = 0.2 * std::sin(2.0 * i + 1);
      state.speed[0][k] = (limb.joint[k].slides ? 0.4 : 2) * std::cos(3.0 * i);
    }
    limb.joint[3].kind = AxisKind::any;
    limb.joint[3].axis = {0.48, 0.6, 0.64};
    around = in_the_air(tree);
    state.rate = {0.5, -0.8, 1.1};
    state.velocity = {0.4, 0.1, -0.2};
  }
  void go(double seconds, double dt) {
    for (long k = 0; k < std::lround(seconds / dt); ++k) step_body(tree, around, loads, dt, state, work);
  }
};

// Source: Newton and Euler: momentum, angular momentum about the centre of mass and energy in free flight,
// summed link by link in world axes. Semi-implicit Euler keeps them to first order of the step.
TEST(Trees, ALimbThatBranchesAndSlidesKeepsMomentumSpinAndEnergyToFirstOrder) {
  double off[3][3];
  const double steps[3] = {4e-4, 2e-4, 1e-4};
  for (int k = 0; k < 3; ++k) {
    Tumble run;
    const Totals before = totals(run.tree, run.state);
    run.go(0.2, steps[k]);
    const Totals after = totals(run.tree, run.state);
    const V3 dp = after.momentum - before.momentum + V3{0, 0, after.mass * 9.81 * 0.2};
    const V3 dh = after.spin - before.spin;
    off[k][0] = std::sqrt(dot(dp, dp));
    off[k][1] = std::sqrt(dot(dh, dh));
    off[k][2] = std::fabs(after.kinetic + after.potential - before.kinetic - before.potential);
  }
  for (int what = 0; what < 3; ++what) {
    EXPECT_LT(off[2][what], 2e-2) << what;
    EXPECT_NEAR(std::log2(off[0][what] / off[1][what]), 1, 0.25) << what;
    EXPECT_NEAR(std::log2(off[1][what] / off[2][what]), 1, 0.25) << what;
  }
}

// Source: a mass on a slide in the air: trunk and slide part as their reduced mass says.
TEST(Trees, ASlideAcceleratesAsItsReducedMass) {
  Tumble run;
  run.tree.leg[0].joint_count = run.tree.joint_count = 1;
  auto& slide = run.tree.leg[0].joint[0];
  slide = hinge(AxisKind::z, {0, 0, -0.1}, 2, {0, 0, 0}, {0.01, 0.01, 0.01});
  slide.slides = true;
  run.tree.trunk = {};
  run.tree.trunk.mass = 3;
  run.tree.trunk.inertia = {0.1, 0.1, 0.1, 0, 0, 0};
  run.around.trunk = trunk_of(run.tree);
  run.state = {};
  run.loads[0][0] = {6, 0};
  run.go(1e-3, 1e-3);
  EXPECT_NEAR(run.state.speed[0][0], 6 / (2 * 3 / 5.0) * 1e-3, 1e-15);
  EXPECT_NEAR(run.state.velocity.z, (-9.81 - 2.0) * 1e-3, 1e-14);
}

TEST(Trees, ASlideHasItsOwnEndStops) {
  Tumble run;
  run.tree.leg[0].joint_count = run.tree.joint_count = 1;
  auto& slide = run.tree.leg[0].joint[0];
  slide = hinge(AxisKind::z, {0, 0, 0}, 2, {0, 0, 0}, {0.01, 0.01, 0.01});
  slide.slides = true;
  slide.angle_min = -0.05;
  slide.angle_max = 0.05;
  run.tree.trunk.mass = 1e9;
  run.tree.trunk.inertia = {1e9, 1e9, 1e9, 0, 0, 0};
  run.around.trunk = trunk_of(run.tree);
  run.around.push = {0, 0, 1e9 * 9.81};
  run.state = {};
  run.go(2, 1e-3);
  EXPECT_NEAR(run.state.angle[0][0], -0.05 - 2 * 9.81 / 60000, 1e-6);  // Hooke
}

// --- Whole robots. ---

class Own : public ::testing::TestWithParam<const char*> {
 protected:
  files::RobotFile file_ = own_robot(GetParam());
  std::shared_ptr<const Model> model_ = model_of(file_);

  double pressed(const SimulatedRobot& robot) const {
    double sum = 0;
    const auto& grip = robot.state().body.grip;
    for (const auto& leg : grip.leg) sum += leg[0] + leg[1];
    for (const auto& more : grip.more) {
      for (const double n : more) sum += n;
    }
    for (const double n : grip.corner) sum += n;
    return sum;
  }
};

TEST_P(Own, StandsOnItsFeetWithItsWeight) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  Holder holder(file_.robot());
  holder.run(robot, 4);
  EXPECT_FALSE(robot.fallen());
  EXPECT_FALSE(robot.truth().other_contact);
  EXPECT_LT(robot.truth().tilt_rad, 0.12);
  EXPECT_NEAR(robot.truth().height_m, model_->stance_height_m(), 0.05);
  double mean = 0;  // the sensors' noise shakes the drives
  for (int k = 0; k < 1000; ++k) {
    holder.tick(robot);
    mean += pressed(robot) / 1000;
  }
  EXPECT_NEAR(mean, model_->mass_kg() * 9.80665, 0.2);
}

TEST_P(Own, LetGoItLiesAndDoesNotSink) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  robot.state().body.position.z += 0.1;
  robot.state().body.rate = {1.5, 0.5, 0.2};
  for (int k = 0; k < 6000; ++k) {
    robot.command({}, false);
    robot.step();
  }
  EXPECT_TRUE(robot.fallen());
  EXPECT_NEAR(pressed(robot), model_->mass_kg() * 9.80665, 0.05 * model_->mass_kg() * 9.80665);
  std::vector<double> angle(static_cast<std::size_t>(model_->joint_count()));
  const auto& tree = model_->figures().tree;
  const auto& body = robot.state().body;
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      angle[static_cast<std::size_t>(tree.leg[l].joint[i].order)] = body.angle[l][i];
    }
  }
  const double reach =
      reach_below(tree, angle.data(), turn_back(rotation_of(body.attitude), Vec3<double>{0, 0, -1}));
  const double sunk = reach - body.position.z;
  EXPECT_GT(sunk, 0);
  EXPECT_LT(sunk, model_->mass_kg() * 9.80665 / 24000);  // all of its weight on one point
}

TEST_P(Own, SavesAndGoesOnWithTheSameBits) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  Holder holder(file_.robot());
  holder.run(robot, 0.3);
  const std::string saved = robot.save();
  SimulatedRobot other(model_, nominal_site(*model_), 1);
  std::string error;
  ASSERT_TRUE(other.restore(saved, error)) << error;
  Holder again = holder;
  holder.run(robot, 0.3);
  again.run(other, 0.3);
  EXPECT_EQ(robot.state().body.position.x, other.state().body.position.x);
  EXPECT_EQ(robot.state().body.angle[0][0], other.state().body.angle[0][0]);
}

INSTANTIATE_TEST_SUITE_P(Robots, Own, ::testing::Values("whimbrel18", "turnstone8", "knot12"));

TEST(Trees, ATailThatPropsIsNoFallButItsMiddleIs) {
  const files::RobotFile file = own_robot("turnstone8");
  const auto model = model_of(file);
  SimulatedRobot robot(model, nominal_site(*model), 1);
  robot.place_standing(1);
  Holder holder(file.robot());
  holder.run(robot, 2);
  const auto& tree = model->figures().tree;
  const auto& tail = tree.leg[2];
  ASSERT_TRUE(tail.general);
  EXPECT_GT(robot.state().body.grip.leg[2][0], 5);  // N on the tail's tip
  EXPECT_FALSE(robot.truth().other_contact);
  Grip<double> grip = robot.state().body.grip;
  EXPECT_FALSE(lies(tree, grip));
  grip_of(grip, 2, 1) = 3;  // where the slide begins
  EXPECT_TRUE(lies(tree, grip));
}

TEST(Trees, AWaistCarriesItsLegsAndItsMastInOneLimb) {
  const auto model = model_of(own_robot("knot12"));
  const auto& tree = model->figures().tree;
  ASSERT_EQ(tree.leg_count, 3);
  EXPECT_FALSE(tree.leg[0].general);
  const auto& limb = tree.leg[2];
  EXPECT_TRUE(limb.general);
  EXPECT_EQ(limb.joint_count, 6);
  ASSERT_EQ(limb.point_count, 2 + 1 + 5);  // two feet, the mast's end, five joints that the waist carries
  EXPECT_TRUE(limb.point[0].foot && limb.point[1].foot && !limb.point[2].foot);
}

// A prismatic joint that a scenario makes play has it in metres.
TEST(Trees, ASlideHasPlayInMetres) {
  const files::RobotFile file = own_robot("turnstone8");
  const auto model = model_of(file);
  SimulatedRobot robot(model, site_from("wear { joint: \"tail_slide\" backlash_rad: 0.006 }", file, *model),
                       1);
  robot.place_standing(1);
  Holder holder(file.robot());
  holder.run(robot, 3);
  EXPECT_FALSE(robot.fallen());
  const double apart = robot.state().drives.rotor_angle[7] - robot.state().body.angle[2][1];
  EXPECT_NEAR(std::fabs(apart), 0.003, 3e-4);
}

TEST(Trees, WhatStaysImpossibleIsRefusedInOneLine) {
  const auto refused = [](const v1::Robot& robot) {
    std::string error;
    EXPECT_EQ(Model::make(robot, error), nullptr);
    EXPECT_EQ(error.find('\n'), std::string::npos);
    return error;
  };
  const files::RobotFile file = own_robot("knot12");
  v1::Robot robot = file.robot();
  for (int i = 0; i < 3; ++i) {
    auto* joint = robot.add_joints();
    *joint = file.robot().joints(11);
    joint->set_name("more" + std::to_string(i));
    joint->set_parent("mast");
  }
  EXPECT_EQ(refused(robot), "waist: found a limb of 9 joints from here outward, expected at most 8");
  robot = file.robot();
  for (int i = 0; i < 6; ++i) {
    auto* joint = robot.add_joints();
    *joint = file.robot().joints(11);
    joint->set_name("more" + std::to_string(i));
    joint->clear_parent();
  }
  EXPECT_EQ(refused(robot), "joints: found more than 8 limbs on the trunk, expected at most 8");
}

}  // namespace
}  // namespace pastern::stub
