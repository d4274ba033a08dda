// The simulated robot as a whole: it stands, walks, falls and lies; same calls, same bits.
#include <google/protobuf/text_format.h>
#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <random>

#include "hal_stub/robot/advance.h"
#include "tests/hal_stub/robots.h"

namespace pastern::stub {
namespace {

class Robot : public ::testing::TestWithParam<const char*> {
 protected:
  files::RobotFile file_ = robot_file(GetParam());
  std::shared_ptr<const Model> model_ = model_of(file_);
};

TEST_P(Robot, StandsStillWhenHeldInTheStance) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  Holder holder(file_.robot());
  holder.run(robot, 3);
  const Truth before = robot.truth();
  holder.run(robot, 3);
  const Truth after = robot.truth();
  EXPECT_FALSE(after.fallen);
  EXPECT_NEAR(after.height_m, model_->stance_height_m(), 0.03);
  EXPECT_LT(after.tilt_rad, 0.03);
  EXPECT_NEAR(after.position_m[0], before.position_m[0], 0.005);
  EXPECT_NEAR(after.position_m[1], before.position_m[1], 0.005);
}

TEST_P(Robot, WeighsOnItsFeetWhatItWeighs) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  Holder holder(file_.robot());
  holder.run(robot, 3);
  double sum = 0;
  for (int k = 0; k < 200; ++k) {
    holder.tick(robot);
    for (const auto& leg : robot.state().body.grip.leg) sum += leg[0];
  }
  EXPECT_NEAR(sum / 200, model_->mass_kg() * 9.80665, 0.02 * model_->mass_kg() * 9.80665);
}

TEST_P(Robot, TrotsForwardOpenLoopWithoutFalling) {
  for (std::uint64_t draw = 1; draw <= 5; ++draw) {
    Site site = nominal_site(*model_);
    site.start_scatter_rad = 0.02;
    SimulatedRobot robot(model_, site, draw);
    robot.place_standing(draw);
    Holder holder(file_.robot());
    holder.trot(robot, 5, 0.25, 0.07);
    EXPECT_FALSE(robot.fallen());
    EXPECT_GT(robot.truth().position_m[0], 1.5);
  }
}

TEST_P(Robot, RisesFromLyingToTheStance) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_lying(4);
  EXPECT_LT(robot.truth().height_m, 0.12);
  Holder holder(file_.robot());
  (void)robot.read(holder.frame);
  const auto from = holder.frame.angle;
  for (int k = 0; k <= 1000; ++k) {
    for (int j = 0; j < model_->joint_count(); ++j) {
      holder.target[j] = from[j] + k / 1000.0 * (file_.robot().joints(j).stance_rad() - from[j]);
    }
    holder.tick(robot);
  }
  holder.run(robot, 1);
  EXPECT_FALSE(robot.truth().fallen);
  EXPECT_NEAR(robot.truth().height_m, model_->stance_height_m(), 0.03);
}

// Dropped in any attitude, with the torque off, for 3 s: it lies on the ground, at rest, and no point is
// deeper than five times the depth at which one point would carry the whole robot.
TEST_P(Robot, LiesAndDoesNotSinkHoweverItFalls) {
  const double deepest_allowed = 5 * model_->mass_kg() * 9.80665 / 24000;
  for (int i = 0; i < 12; ++i) {
    SimulatedRobot robot(model_, nominal_site(*model_), 1);
    robot.place_standing(1);
    robot.command({}, false);
    auto& body = robot.state().body;
    const double half = i * 3.14159265358979 / 12;
    const double c = std::cos(i * 1.3);
    const double s = std::sin(i * 1.3);
    body.attitude = {std::cos(half), std::sin(half) * c, std::sin(half) * s, 0};
    body.position.z = 0.6;
    for (int k = 0; k < 3000; ++k) {
      robot.command({}, false);
      robot.step();
      ASSERT_TRUE(std::isfinite(body.position.z)) << i;
    }
    const Rotation<double> r = rotation_of(body.attitude);
    double deepest = 0;
    for (const auto& corner : model_->figures().tree.corner) {
      deepest = std::max(deepest, -(body.position.z + (r * corner).z));
    }
    std::array<double, kMaxJoints> angle{};
    for (std::size_t l = 0; l < 4; ++l) {
      for (std::size_t j = 0; j < static_cast<std::size_t>(model_->figures().tree.leg[l].joint_count); ++j) {
        angle[static_cast<std::size_t>(model_->figures().tree.leg[l].joint[j].order)] = body.angle[l][j];
      }
    }
    const double reach =
        reach_below(model_->figures().tree, angle.data(), turn_back(r, Vec3<double>{0, 0, -1}));
    deepest = std::max(deepest, reach - body.position.z);
    EXPECT_LT(deepest, deepest_allowed) << i;
    EXPECT_GT(deepest, 0) << "it lies on something, " << i;
    EXPECT_LT(std::sqrt(dot(body.velocity, body.velocity)), 0.1) << i;
    EXPECT_TRUE(robot.fallen()) << i;
  }
}

TEST_P(Robot, SameSeedAndDrawGiveTheSameBitsAndOthersDoNot) {
  Site site = nominal_site(*model_);
  site.start_scatter_rad = 0.03;
  site.push_m_per_s = 0.2;
  site.command_jitter_s = 0.003;
  const auto end = [&](std::uint64_t seed, std::uint64_t draw) {
    SimulatedRobot robot(model_, site, seed);
    robot.place_standing(draw);
    Holder holder(file_.robot());
    holder.trot(robot, 1.5, 0.2, 0.05);
    return robot.state().body.position.x;
  };
  EXPECT_EQ(end(3, 8), end(3, 8));
  EXPECT_NE(end(3, 8), end(3, 9));
  EXPECT_NE(end(3, 8), end(4, 8));
}

TEST_P(Robot, RenewedIsANewRobot) {
  Site site = nominal_site(*model_);
  site.push_m_per_s = 0.2;
  SimulatedRobot used(model_, nominal_site(*model_), 1);
  used.place_standing(1);
  Holder warm(file_.robot());
  warm.trot(used, 2, 0.2, 0.05);
  used.renew(site, 9);
  SimulatedRobot fresh(model_, site, 9);
  for (SimulatedRobot* robot : {&used, &fresh}) {
    robot->place_standing(2);
    Holder holder(file_.robot());
    holder.trot(*robot, 1, 0.2, 0.05);
  }
  EXPECT_EQ(used.state().body.position.x, fresh.state().body.position.x);
  EXPECT_EQ(used.state().pack.charge, fresh.state().pack.charge);
}

TEST_P(Robot, RestoredGoesOnLikeOneNeverInterrupted) {
  Site site = nominal_site(*model_);
  site.command_delay_s = 0.012;
  site.command_jitter_s = 0.003;
  site.sensor_delay_s = 0.004;
  site.push_m_per_s = 0.2;
  site.backlash_rad[2] = 0.02;
  SimulatedRobot first(model_, site, 5);
  first.place_standing(3);
  Holder holder(file_.robot());
  holder.trot(first, 1.2, 0.2, 0.05);
  SimulatedRobot second(model_, site, 0);
  std::string error;
  ASSERT_TRUE(second.restore(first.save(), error)) << error;
  Holder other = holder;
  holder.trot(first, 1.5, 0.2, 0.05);
  other.trot(second, 1.5, 0.2, 0.05);
  EXPECT_EQ(first.save(), second.save());
}

// Over a slow bus the first frames tell of the mark that the robot was placed on, never of a pose before.
TEST_P(Robot, LateFramesBeginWithThePlacing) {
  Site site = nominal_site(*model_);
  site.sensor_delay_s = 0.004;
  site.sensor_noise_ratio = 0;
  SimulatedRobot robot(model_, site, 5);
  robot.place_standing(3);
  const double step = model_->sensors().encoder_step_rad();
  for (int tick = 0; tick < 5; ++tick) {
    safety::SensorFrame frame;
    ASSERT_TRUE(robot.read(frame));
    for (int j = 0; j < model_->joint_count(); ++j) {
      EXPECT_NEAR(frame.angle[j], model_->stance()[static_cast<std::size_t>(j)], step) << "tick " << tick;
    }
    robot.step();
  }
}

TEST_P(Robot, RefusesAStateOfAnotherRobotOrSite) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  const auto other_model =
      model_of(robot_file(std::string(GetParam()) == "dunlin12" ? "dunlin8" : "dunlin12"));
  SimulatedRobot other(other_model, nominal_site(*other_model), 1);
  std::string error;
  EXPECT_FALSE(robot.restore(other.save(), error));
  EXPECT_NE(error.find("another robot"), std::string::npos) << error;
  Site late = nominal_site(*model_);
  late.command_delay_s = 0.03;
  SimulatedRobot delayed(model_, late, 1);
  EXPECT_FALSE(robot.restore(delayed.save(), error));
  EXPECT_NE(error.find("length"), std::string::npos) << error;
}

TEST_P(Robot, HeatAndChargeCarryOverWhenItIsPutBack) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  Holder holder(file_.robot());
  holder.trot(robot, 5, 0.25, 0.06);
  const double winding = robot.state().drives.winding[2];
  const double charge = robot.state().pack.charge;
  EXPECT_GT(winding, 25.02);
  EXPECT_LT(charge, 0.7);
  robot.place_lying(2);
  EXPECT_EQ(robot.state().drives.winding[2], winding);
  EXPECT_EQ(robot.state().pack.charge, charge);
  EXPECT_NEAR(robot.truth().position_m[0], 0, 1e-12);
}

/// A worn site, so that no term is zero by chance.
SiteFigures<double> worn_site(const Model& model) {
  const auto& tree = model.figures().tree;
  SiteFigures<double> site{};
  site.around.trunk = {tree.trunk.mass, tree.trunk.centre, tree.trunk.inertia};
  site.around.push = {30, -20, 5};
  site.drives.ambient = 5;
  for (std::size_t j = 0; j < kMaxJoints; ++j) {
    site.drives.strength[j] = 0.8 + 0.01 * static_cast<double>(j);
    site.drives.damping[j] = 0.1;
    site.drives.coulomb[j] = 0.2;
    site.drives.half_gap[j] = j % 5 == 2 ? 0.004 : 0;
  }
  site.pack = {44, 0.1};
  return site;
}

void expect_same(const RobotState<double>& a, const RobotState<double>& b) {
  EXPECT_NEAR(a.body.velocity.x, b.body.velocity.x, 1e-11);
  EXPECT_NEAR(a.body.velocity.z, b.body.velocity.z, 1e-11);
  EXPECT_NEAR(a.body.rate.y, b.body.rate.y, 1e-10);
  EXPECT_NEAR(a.pack.voltage, b.pack.voltage, 1e-9);
  for (std::size_t l = 0; l < kMaxTreeLegs; ++l) {
    for (std::size_t i = 0; i < kMaxLimb; ++i) {
      EXPECT_NEAR(a.body.speed[l][i], b.body.speed[l][i], 1e-9);
      EXPECT_NEAR(a.body.angle[l][i], b.body.angle[l][i], 1e-11);
    }
    EXPECT_NEAR(a.body.grip.leg[l][0], b.body.grip.leg[l][0], 1e-6);
  }
  for (std::size_t j = 0; j < kMaxJoints; ++j) {
    EXPECT_NEAR(a.drives.torque[j], b.drives.torque[j], 1e-9);
    EXPECT_NEAR(a.drives.rotor_speed[j], b.drives.rotor_speed[j], 1e-9);
    EXPECT_NEAR(a.drives.winding[j], b.drives.winding[j], 1e-11);
  }
}

// The fitted step rounds elsewhere than the plain one: a few units in the last place of the largest terms,
// which a stiff contact magnifies. Compared state by state over a walk, each from the same state.
TEST_P(Robot, FittedStepIsThePlainStep) {
  SimulatedRobot robot(model_, nominal_site(*model_), 1);
  robot.place_standing(1);
  Holder holder(file_.robot());
  const SiteFigures<double> site = worn_site(*model_);
  Stepper stepper(model_->figures());
  stepper.take_site(site);
  Told<double> told{};
  for (std::size_t j = 0; j < kMaxJoints; ++j) told.wanted[j] = 3 * std::sin(static_cast<double>(j));
  for (int k = 0; k < 60; ++k) {
    holder.trot(robot, 0.02, 0.2, 0.05);
    RobotState<double> fitted = robot.state();
    RobotState<double> plain = robot.state();
    RobotWork<double> work{};
    stepper.step(site, told, 1e-3, fitted, work);
    step_plainly(model_->figures(), site, told, 1e-3, plain, work);
    expect_same(fitted, plain);
  }
}

// Six legs have no fitted form: the general one serves.
TEST_P(Robot, AnyNumberOfLegsIsStepped) {
  Figures<double> figures = model_->figures();
  figures.tree.leg_count = 6;
  for (std::size_t l = 4; l < 6; ++l) {
    figures.tree.leg[l] = figures.tree.leg[l - 4];
    for (auto& joint : figures.tree.leg[l].joint) joint.order += model_->joint_count();
  }
  const auto joints = static_cast<std::size_t>(model_->joint_count());
  for (std::size_t j = joints; j < 24; ++j) figures.drive[j] = figures.drive[j - joints];
  const SiteFigures<double> site = worn_site(*model_);
  Stepper stepper(figures);
  stepper.take_site(site);
  RobotState<double> fitted{};
  fitted.body.position.z = 0.3;
  fitted.pack = {0.6, 44, 0};
  for (auto& leg : fitted.body.angle) leg = {0, 0.7, -1.4, 0};
  RobotState<double> plain = fitted;
  RobotWork<double> work{};
  for (int k = 0; k < 5; ++k) {
    stepper.step(site, {}, 1e-3, fitted, work);
    step_plainly(figures, site, {}, 1e-3, plain, work);
  }
  expect_same(fitted, plain);
}

/// A robot file whose gate allows less than its drives can make, as on a first start.
files::RobotFile low_limits(const std::string& name, double share) {
  const files::RobotFile shipped = robot_file(name);
  v1::Robot robot = shipped.robot();
  for (auto& joint : *robot.mutable_joints()) {
    joint.mutable_guard()->set_peak_torque_nm(share * joint.drive().peak_torque_nm());
  }
  std::string text;
  EXPECT_TRUE(google::protobuf::TextFormat::PrintToString(robot, &text));
  files::Defects defects;
  auto file = files::parse_robot(text, "low limits", defects);
  EXPECT_TRUE(file) << files::lines(defects);
  return file ? *file : shipped;
}

// The drive corrects a late torque by its own encoder: however far the joint has moved meanwhile, and
// whatever is commanded, no torque beyond the gate's, and none when it is off or the drives have let go.
TEST_P(Robot, ADriveNeverGoesBeyondTheGatesPeakNorActsWhenItIsOff) {
  const files::RobotFile file = low_limits(GetParam(), 0.3);
  const auto model = model_of(file);
  Site site = nominal_site(*model);
  site.command_delay_s = 0.030;
  site.command_jitter_s = 0.020;
  site.sensor_delay_s = 0.005;
  SimulatedRobot robot(model, site, 5);
  robot.place_standing(1);
  safety::SensorFrame frame;
  std::mt19937_64 random(11);
  double most = 0;
  int off = 0;
  for (int k = 0; k < 4000; ++k) {
    if (random() % 3 != 0) (void)robot.read(frame);
    safety::Torques<> torque;
    for (auto& x : torque.values) {
      const std::uint64_t bits = random();
      x = bits % 50 == 0 ? std::numeric_limits<double>::quiet_NaN()
                         : (bits % 2 == 0 ? 1 : -1) * (bits % 7 == 0 ? 1e308 : 0.3 * 30.0);
    }
    const int part = k % 1000;
    if (part < 300) robot.command(torque, part < 200 || part >= 250);  // then silent
    robot.step();
    const bool none = robot.torque_mode() == TorqueMode::off;
    for (int j = 0; j < model->joint_count(); ++j) {
      const auto i = static_cast<std::size_t>(j);
      const double made = std::fabs(robot.state().drives.torque[i]);
      ASSERT_LE(made, none ? 0.0 : model->figures().drive[i].peak_torque) << "joint " << j << " tick " << k;
      if (robot.torque_mode() != TorqueMode::on) continue;
      ASSERT_LE(made, model->envelope()[i]) << "joint " << j << " tick " << k;
      most = std::max(most, made / model->envelope()[i]);
    }
    off += none ? 1 : 0;
    if (part > 299 + 50 + 20 + 501) {
      ASSERT_TRUE(none) << "tick " << k;
    }
  }
  EXPECT_EQ(most, 1.0);
  EXPECT_GT(off, 400);
}

TEST_P(Robot, DrivesThatHaveLetGoStayOffUntilTheyAreToldOff) {
  const files::RobotFile file = robot_file(GetParam());
  const auto model = model_of(file);
  SimulatedRobot robot(model, nominal_site(*model), 5);
  robot.place_standing(1);
  Holder holder(file.robot());
  holder.run(robot, 0.1);
  ASSERT_EQ(robot.torque_mode(), TorqueMode::on);
  const auto silence = std::lround((model->drive_timeout_s() + 0.6) / model->period_s());
  for (long k = 0; k < silence; ++k) robot.step();
  ASSERT_EQ(robot.torque_mode(), TorqueMode::off);
  holder.run(robot, 0.05);  // the program goes on where it was stopped
  EXPECT_EQ(robot.torque_mode(), TorqueMode::off);
  robot.command({}, false);
  robot.step();
  holder.run(robot, 0.01);
  EXPECT_EQ(robot.torque_mode(), TorqueMode::on);
}

INSTANTIATE_TEST_SUITE_P(Shipped, Robot, ::testing::Values("dunlin12", "dunlin8"));

TEST(Model, ShippedRobotsWeighWhatTheirFilesSay) {
  EXPECT_NEAR(model_of(robot_file("dunlin12"))->mass_kg(), 17.36, 1e-9);
  EXPECT_NEAR(model_of(robot_file("dunlin8"))->mass_kg(), 10.92, 1e-9);
}

}  // namespace
}  // namespace pastern::stub
