// A walk in process: chance by lot, score, falls.
#include "tools/train/walk.h"

#include <gtest/gtest.h>

#include "tests/tools/train/robots.h"
#include "tools/train/sites.h"
#include "tools/train/trainer.h"
#include "tools/train/trot.h"

namespace pastern::tools {
namespace {

struct Ground {
  explicit Ground(const char* name, double walk_s = 2)
      : robot(test::robot(name)), policy(open_loop_trot(robot.robot())) {
    std::string error;
    setting = WalkSetting::make(robot.robot(), policy, walk_s, error);
    if (!setting) throw std::runtime_error(error);
    trot.assign(policy.parameters().begin(), policy.parameters().end());
    still.assign(trot.size(), 0);
  }
  files::RobotFile robot;
  v1::Policy policy;
  std::shared_ptr<const WalkSetting> setting;
  Parameters trot;
  Parameters still;  ///< the policy that holds the stance
};

bool same(const Score& a, const Score& b) {
  return a.terms.forward == b.terms.forward && a.terms.energy == b.terms.energy &&
         a.terms.drift == b.terms.drift && a.terms.turn == b.terms.turn && a.terms.fall == b.terms.fall &&
         a.fell == b.fell && a.distance_m == b.distance_m;
}

TEST(Walk, IsAFunctionOfItsLotWhateverWasWalkedBefore) {
  const Ground ground("dunlin12");
  WalkCourse course(ground.setting, drawn_sites(wide_ranges()));
  const Score first = course.run(ground.trot, {1, 5});
  const Score other = course.run(ground.trot, {1, 6});
  const Score again = course.run(ground.trot, {1, 5});
  EXPECT_TRUE(same(first, again));
  EXPECT_TRUE(same(course.run(ground.trot, {1, 5}), first)) << "straight after a walk of the same lot";
  EXPECT_FALSE(same(first, other));
  EXPECT_TRUE(same(course.another()->run(ground.trot, {1, 5}), first));
}

TEST(Walk, StandingStillEarnsNothingAndFallsNot) {
  for (const char* name : {"dunlin8", "dunlin12"}) {
    const Ground ground(name);
    WalkCourse course(ground.setting, one_site(stub::nominal_site(ground.setting->model())));
    const Score score = course.run(ground.still, {1, 1});
    EXPECT_FALSE(score.fell);
    EXPECT_NEAR(score.terms.forward, 0, 0.05);
    EXPECT_NEAR(score.distance_m, 0, 0.05);
    EXPECT_EQ(score.terms.fall, 0);
  }
}

// Speed beyond the cap earns no more; nothing is earned backward of the start's own heading.
TEST(Walk, TermsAreThoseOfTheReturn) {
  const Ground ground("dunlin12");
  WalkCourse course(ground.setting, one_site(stub::nominal_site(ground.setting->model())));
  const Score score = course.run(ground.trot, {1, 2});
  EXPECT_LE(score.terms.forward, 0.8 * 2 + 1e-9);
  EXPECT_LE(score.terms.forward, score.distance_m + 1e-6);
  EXPECT_LT(score.terms.energy, 0);
  EXPECT_LE(score.terms.drift, 0);
}

// A robot thrown about by its own legs falls, loses the fall term, and earns nothing afterwards.
TEST(Walk, AFallEndsTheWalkAndCosts) {
  const Ground ground("dunlin12", 5);
  Parameters wild = ground.trot;
  for (double& value : wild) value *= 8;
  WalkCourse course(ground.setting, drawn_sites(wide_ranges()));
  int falls = 0;
  for (std::uint64_t i = 0; i < 8; ++i) {
    const Score score = course.run(wild, {2, i});
    if (!score.fell) continue;
    ++falls;
    EXPECT_EQ(score.terms.fall, -ground.robot.robot().return_weights().fall());
    EXPECT_LT(score.terms.forward, 0.8 * 5);
  }
  EXPECT_GE(falls, 4);
}

// Rear legs that give way: the trunk comes down to less than half its height.
TEST(Walk, ALegThatGivesWayIsAFall) {
  const Ground ground("dunlin12");
  stub::Site weak = stub::nominal_site(ground.setting->model());
  weak.strength.fill(0.03);
  WalkCourse course(ground.setting, one_site(weak));
  EXPECT_TRUE(course.run(ground.still, {1, 1}).fell);
}

TEST(Walk, PushesAndScatterDifferBetweenLotsOfOneSite) {
  const Ground ground("dunlin8");
  stub::Site site = stub::nominal_site(ground.setting->model());
  site.push_m_per_s = 0.2;
  site.start_scatter_rad = 0.05;
  WalkCourse course(ground.setting, one_site(site));
  EXPECT_FALSE(same(course.run(ground.trot, {1, 1}), course.run(ground.trot, {1, 2})));
}

}  // namespace
}  // namespace pastern::tools
