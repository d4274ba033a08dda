// A walk of training against the same walk through the whole cycle: plug-in, estimator, policy, PD and gate.
// The two must agree on how good a policy is, or training would climb another hill than the session's.
#include <gtest/gtest.h>

#include "proto/files/policy_file.h"
#include "runtime/session/in_process.h"
#include "tests/tools/train/robots.h"
#include "tools/train/trainer.h"
#include "tools/train/walk.h"

namespace pastern::tools {
namespace {

constexpr int kWalks = 4;

struct Means {
  double total{0};
  double forward{0};
  double energy{0};
};

Means through_the_cycle(const files::RobotFile& robot, const v1::Policy& policy) {
  std::string error;
  auto drives =
      hal::Drives::open(session::drives_config(robot, STUB_PATH, "", 5, session::Pace::stepped), error);
  if (!drives) throw std::runtime_error(error);
  session::Cycle cycle(robot.robot(), policy, std::move(drives), session::Pace::stepped);
  EXPECT_TRUE(cycle.run(session::Motion::rise, 0).completed);
  Means means;
  for (int walk = 0; walk < kWalks; ++walk) {
    EXPECT_TRUE(cycle.run(session::Motion::stand, 1).completed);
    const session::MotionResult result = cycle.run(session::Motion::walk, 5);
    EXPECT_EQ(result.outcome, Outcome::completed);
    means.total += result.terms.total() / kWalks;
    means.forward += result.terms.forward / kWalks;
    means.energy += result.terms.energy / kWalks;
    EXPECT_TRUE(cycle.run(session::Motion::settle, 0).completed);
  }
  return means;
}

Means in_process(const files::RobotFile& robot, const v1::Policy& policy) {
  std::string error;
  const auto setting = WalkSetting::make(robot.robot(), policy, 5, error);
  if (!setting) throw std::runtime_error(error);
  WalkCourse course(setting, one_site(stub::nominal_site(setting->model())));
  const Parameters parameters(policy.parameters().begin(), policy.parameters().end());
  Means means;
  for (std::uint64_t walk = 0; walk < kWalks; ++walk) {
    const Score score = course.run(parameters, {5, walk});
    EXPECT_FALSE(score.fell);
    means.total += score.terms.total() / kWalks;
    means.forward += score.terms.forward / kWalks;
    means.energy += score.terms.energy / kWalks;
  }
  return means;
}

// Tolerances: leg odometry is some per cent off in speed; the session's drift is what odometry makes of it,
// up to half a metre sideways in five (seen: 0.4 of return on dunlin8, 0.05 on dunlin12). A disagreement in
// kind (wrong sign of the heading, a missing term, another clock of the gait) costs a unit or more.
TEST(SessionWalk, ScoresAsTheWalkOfTrainingDoes) {
  for (const char* name : {"dunlin12", "dunlin8"}) {
    const files::RobotFile robot = test::robot(name);
    files::Defects defects;
    const auto policy = files::read_policy(
        std::string(PASTERN_SOURCE_DIR) + "/hal_stub/policies/" + name + ".policy", robot, defects);
    ASSERT_TRUE(policy) << files::lines(defects);
    const Means cycle = through_the_cycle(robot, policy->policy());
    const Means walk = in_process(robot, policy->policy());
    EXPECT_NEAR(cycle.forward, walk.forward, 0.2) << name;
    EXPECT_NEAR(cycle.energy, walk.energy, 0.1) << name;
    EXPECT_NEAR(cycle.total, walk.total, 0.65) << name;
  }
}

}  // namespace
}  // namespace pastern::tools
