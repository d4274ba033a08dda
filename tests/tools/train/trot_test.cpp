// The start point.
#include "tools/train/trot.h"

#include <gtest/gtest.h>

#include <cmath>

#include "proto/files/policy_file.h"
#include "tests/tools/train/robots.h"

namespace pastern::tools {
namespace {

TEST(OpenLoopTrot, IsASoundPolicyForEachShippedRobot) {
  for (const char* name : {"dunlin8", "dunlin12"}) {
    const files::RobotFile robot = test::robot(name);
    files::Defects defects;
    EXPECT_TRUE(files::parse_policy(files::pack_policy(open_loop_trot(robot.robot())), name, robot, defects))
        << files::lines(defects);
  }
}

// Legs diagonally opposite move together, the other pair against them, and nothing else than the phase has a
// say.
TEST(OpenLoopTrot, PairsTheLegsAcross) {
  const files::RobotFile robot = test::robot("dunlin8");
  const v1::Policy policy = open_loop_trot(robot.robot());
  const int inputs = policy.channels_size();
  const auto weight = [&](int output, int input) { return policy.parameters(output * inputs + input); };
  ASSERT_EQ(policy.legs_size(), 4);
  const double sine = weight(0, inputs - 2);
  const double cosine = weight(1, inputs - 1);
  EXPECT_GT(std::abs(sine), 0.1);
  EXPECT_LT(sine * cosine, 0);  // forward swing (rising sine, positive cosine) goes with a short leg
  const double sign[] = {1, -1, -1, 1};
  for (int leg = 0; leg < 4; ++leg) {
    for (int i = 0; i < inputs; ++i) {
      EXPECT_EQ(weight(2 * leg, i), i == inputs - 2 ? sign[leg] * sine : 0);
      EXPECT_EQ(weight(2 * leg + 1, i), i == inputs - 1 ? sign[leg] * cosine : 0);
    }
  }
}

}  // namespace
}  // namespace pastern::tools
