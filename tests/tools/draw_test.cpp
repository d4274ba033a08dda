// Pictures of walks: parts stand where the robot's geometry puts them, a recorded walk gives the places of
// the walk it was recorded from, wrong wishes get one line.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <regex>

#include "proto/files/robot_file.h"
#include "tests/tools/run.h"
#include "tests/tools/synthetic.h"
#include "tools/draw/picture.h"

namespace pastern::testing {

using namespace tools;
namespace {

const std::string kRobot = PASTERN_SOURCE_DIR "/hal_stub/robots/dunlin12.robot.txtpb";
const std::string kPolicy = PASTERN_SOURCE_DIR "/hal_stub/policies/dunlin12.policy";
const std::string kSite = PASTERN_SOURCE_DIR "/hal_stub/scenarios/wet_ramp.scenario.txtpb";

std::shared_ptr<const stub::Model> a_model() {
  files::Defects defects;
  std::string error;
  const auto file = files::read_robot(kRobot, defects);
  return file ? stub::Model::make(file->robot(), error) : nullptr;
}

stub::SimulatedRobot standing() {
  const auto model = a_model();
  stub::SimulatedRobot robot(model, stub::nominal_site(*model), 1);
  robot.place_standing(1);
  for (int tick = 0; tick < 500; ++tick) robot.step();
  return robot;
}

double distance(const Place& a, const Place& b) { return std::hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]); }

/// What a recorder would have kept of this moment.
v1::Trace record_of(const stub::SimulatedRobot& robot) {
  const stub::Truth truth = robot.truth();
  v1::Trace trace;
  trace.add_time_s(0);
  trace.add_x_m(static_cast<float>(truth.position_m[0]));
  trace.add_y_m(static_cast<float>(truth.position_m[1]));
  trace.add_height_m(static_cast<float>(truth.position_m[2]));
  trace.add_roll_rad(static_cast<float>(truth.roll_rad));
  trace.add_pitch_rad(static_cast<float>(truth.pitch_rad));
  trace.add_yaw_rad(static_cast<float>(truth.yaw_rad));
  std::vector<float> angle(static_cast<std::size_t>(robot.model().joint_count()));
  const auto& tree = robot.model().figures().tree;
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      angle[static_cast<std::size_t>(tree.leg[l].joint[i].order)] =
          static_cast<float>(robot.state().body.angle[l][i]);
    }
  }
  trace.mutable_joint_angle_rad()->Add(angle.begin(), angle.end());
  return trace;
}

TEST(Draw, AStandingRobotHasItsFeetOnTheGroundItsWeightOnThemAndLinksOfTheirLength) {
  const Still still = still_of(standing(), 0);
  ASSERT_EQ(still.legs.size(), 4U);
  double force = 0;
  for (const DrawnLeg& leg : still.legs) {
    ASSERT_EQ(leg.points.size(), 4U);  // abduction, hip, knee, foot
    EXPECT_NEAR(leg.points.back()[2], 0, 0.005);
    EXPECT_NEAR(distance(leg.points[1], leg.points[2]), 0.245, 1e-3);  // the thigh of the robot file
    force += leg.force_n;
  }
  const auto model = a_model();
  EXPECT_NEAR(force, model->mass_kg() * 9.80665, 0.1 * model->mass_kg() * 9.80665);
  const Place edges = {distance(still.trunk[0], still.trunk[1]), distance(still.trunk[0], still.trunk[2]),
                       distance(still.trunk[0], still.trunk[4])};
  EXPECT_NEAR(edges[0], 0.50, 1e-9);
  EXPECT_NEAR(edges[1], 0.24, 1e-9);
  EXPECT_NEAR(edges[2], 0.14, 1e-9);
}

TEST(Draw, ARecordedMomentIsDrawnWhereItWas) {
  auto robot = standing();
  for (int tick = 0; tick < 300; ++tick) {  // leaning, so that every angle counts
    robot.command({}, true);
    robot.step();
  }
  const Still was = still_of(robot, 0);
  std::string why;
  const auto scene = recorded_scene(robot.model(), record_of(robot), why);
  ASSERT_TRUE(scene) << why;
  ASSERT_EQ(scene->stills.size(), 1U);
  const Still& drawn = scene->stills[0];
  for (std::size_t l = 0; l < 4; ++l) {
    for (std::size_t i = 0; i < 4; ++i) {
      EXPECT_LT(distance(was.legs[l].points[i], drawn.legs[l].points[i]), 1e-5);
    }
  }
  for (std::size_t c = 0; c < 8; ++c) EXPECT_LT(distance(was.trunk[c], drawn.trunk[c]), 1e-5);
}

TEST(Draw, ARecordWithoutJointsIsRefusedInWords) {
  const auto robot = standing();
  v1::Trace trace = record_of(robot);
  std::string why;
  trace.mutable_joint_angle_rad()->RemoveLast();
  EXPECT_FALSE(recorded_scene(robot.model(), trace, why));
  EXPECT_NE(why.find("11 joint angles for 1 samples, expected 12"), std::string::npos) << why;
  EXPECT_FALSE(recorded_scene(robot.model(), {}, why));
}

class DrawVerb : public ::testing::Test {
 protected:
  [[nodiscard]] std::string out() const { return folder_.path() + "/walk.svg"; }
  Folder folder_;
};

TEST_F(DrawVerb, ASimulatedWalkIsOneFileThatMovesAndNeedsNothingElse) {
  const Ran ran = run({"draw", "--robot", kRobot, "--policy", kPolicy, "--scenario", kSite, "--seconds", "1",
                       "--out", out()});
  ASSERT_EQ(ran.exit, 0) << ran.err;
  std::ifstream file(out());
  const std::string svg{std::istreambuf_iterator<char>(file), {}};
  EXPECT_NE(svg.find("dunlin12 on wet_ramp, simulated"), std::string::npos);
  for (const char* word : {"href", "src=", "url(", "<script", "@import"}) {
    EXPECT_EQ(svg.find(word), std::string::npos) << word;
  }
  // From the side: 4 legs, 4 forces, the trunk; from above: 4 legs, the trunk. As many values as stills.
  const std::regex moving("values=\"([^\"]*)\"");
  int parts = 0;
  for (std::sregex_iterator i(svg.begin(), svg.end(), moving), end; i != end; ++i, ++parts) {
    const std::string values = (*i)[1];
    EXPECT_EQ(std::count(values.begin(), values.end(), ';'), 50);
    EXPECT_EQ(values.find("nan"), std::string::npos);
  }
  EXPECT_EQ(parts, 14);
}

TEST_F(DrawVerb, TheSameSeedIsTheSamePictureAndAnotherIsNot) {
  const auto drawn = [&](const char* seed) {
    const Ran ran = run({"draw", "--robot", kRobot, "--policy", kPolicy, "--seed", seed, "--scenario", kSite,
                         "--seconds", "0.5", "--out", out()});
    EXPECT_EQ(ran.exit, 0) << ran.err;
    std::ifstream file(out());
    return std::string{std::istreambuf_iterator<char>(file), {}};
  };
  const std::string seven = drawn("7");
  EXPECT_EQ(drawn("7"), seven);
  EXPECT_NE(drawn("8"), seven);
}

TEST_F(DrawVerb, WrongWishesGetOneLineAndLeaveNoFile) {
  ASSERT_TRUE(write_session(folder_.path(), Story{.search_walks = 4, .pairs = 5}));
  const std::vector<std::pair<std::vector<std::string>, int>> wrong = {
      {{"--robot", kRobot}, 2},
      {{"--robot", kRobot, "--policy", kPolicy, "--journal", folder_.path()}, 2},
      {{"--robot", "/nowhere.robot.txtpb", "--policy", kPolicy}, 3},
      {{"--robot", kRobot, "--policy", "/nowhere.policy"}, 3},
      {{"--robot", kRobot, "--policy", kPolicy, "--scenario", "/nowhere.scenario.txtpb"}, 3},
      {{"--robot", kRobot, "--journal", "/nowhere"}, 3},
      {{"--robot", kRobot, "--journal", folder_.path(), "--session", "1"}, 3},   // another robot's
      {{"--robot", kRobot, "--journal", folder_.path(), "--session", "99"}, 3},  // no such walk
  };
  for (const auto& [arguments, exit] : wrong) {
    std::vector<std::string> all = {"draw", "--out", out()};
    all.insert(all.end(), arguments.begin(), arguments.end());
    const Ran ran = run(all);
    EXPECT_EQ(ran.exit, exit) << ran.err;
    EXPECT_EQ(lines_of(ran.err).size(), 1U) << ran.err;
    EXPECT_FALSE(std::filesystem::exists(out())) << ran.err;
  }
  const Ran nowhere = run({"draw", "--robot", kRobot, "--policy", kPolicy, "--seconds", "0.2", "--out",
                           folder_.path() + "/none/walk.svg"});
  EXPECT_EQ(nowhere.exit, 3);
  EXPECT_EQ(lines_of(nowhere.err).size(), 1U) << nowhere.err;
}

}  // namespace
}  // namespace pastern::testing
