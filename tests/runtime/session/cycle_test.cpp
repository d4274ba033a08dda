// The tick and the motions on a puppet. Positions of the minimum-jerk course are values of its polynomial.
#include "runtime/session/cycle.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <vector>

#include "runtime/session/blend.h"
#include "tests/runtime/session/count_allocations.h"
#include "tests/runtime/session/setting.h"

namespace pastern::session {
namespace {

struct Rig {
  explicit Rig(const std::string& fault = "", const std::string& name = "dunlin12")
      : robot(test::shipped_robot(name)),
        policy(test::trot_file(robot)),
        cycle(robot.robot(), policy.policy(), test::puppet(robot, fault)) {}

  void stand() {
    (void)cycle.run(Motion::parked, 0.1);
    const MotionResult risen = cycle.run(Motion::rise, 0);
    ASSERT_TRUE(risen.completed) << safety::name(risen.trip.cause);
    const MotionResult stood = cycle.run(Motion::stand, 0.2);
    ASSERT_TRUE(stood.completed) << safety::name(stood.trip.cause);
  }

  files::RobotFile robot;
  files::PolicyFile policy;
  Cycle cycle;
};

// Ticks until the robot stands: 100 parked, rise_s, 200 standing.
std::string at_walk(const Rig& rig, const std::string& kind, int ticks_into_walk, int lasts) {
  const int first = 300 + static_cast<int>(rig.robot.robot().rise_s() * 1000) + ticks_into_walk;
  return "fault=" + kind + ";at=" + std::to_string(first) + ";for=" + std::to_string(lasts);
}

TEST(Blend, StartsAndEndsAtRestAndIsHalfwayInTheMiddle) {
  EXPECT_EQ(smooth_share(-1), 0);
  EXPECT_EQ(smooth_share(0), 0);
  EXPECT_EQ(smooth_share(1), 1);
  EXPECT_EQ(smooth_share(7), 1);
  EXPECT_DOUBLE_EQ(smooth_share(0.5), 0.5);
  EXPECT_DOUBLE_EQ(smooth_share(0.25), 0.103515625);  // 10/64 - 15/256 + 6/1024
  EXPECT_EQ(smooth_share(std::nan("")), 0);
  EXPECT_LT(smooth_share(1e-3), 1e-8);
}

class CycleOnBothRobots : public testing::TestWithParam<const char*> {};

TEST_P(CycleOnBothRobots, RisesToTheStanceAndLowersToTheLyingPose) {
  Rig rig("", GetParam());
  rig.stand();
  safety::SensorFrame frame;
  ASSERT_EQ(rig.cycle.drives().read(frame), hal::ReadResult::fresh);
  for (int j = 0; j < rig.robot.joint_count(); ++j) {
    EXPECT_NEAR(frame.angle[j], rig.robot.robot().joints(j).stance_rad(), 0.02);
  }
  EXPECT_TRUE(rig.cycle.run(Motion::lower, 0).completed);
  EXPECT_EQ(rig.cycle.report().motion, Motion::parked);
  (void)rig.cycle.drives().read(frame);
  for (int j = 0; j < rig.robot.joint_count(); ++j) {
    EXPECT_NEAR(frame.angle[j], rig.robot.robot().joints(j).lying_rad(), 0.05);
  }
}

TEST_P(CycleOnBothRobots, ScoresAWalkOfTheWholeTime) {
  Rig rig("", GetParam());
  rig.stand();
  const MotionResult walk = rig.cycle.run(Motion::walk, 1.0);
  EXPECT_TRUE(walk.completed);
  EXPECT_FALSE(walk.tripped);
  EXPECT_EQ(walk.outcome, Outcome::completed);
  EXPECT_NEAR(walk.summary.duration_s(), 1.0, 1e-9);
  EXPECT_GT(walk.terms.forward, 0.05);
  EXPECT_LT(walk.terms.energy, 0);
  EXPECT_EQ(walk.terms.fall, 0);
  EXPECT_GE(walk.trace.time_s_size(), 50);
}

double distance(const JointAngles<>& a, const JointAngles<>& b, int joint_count) {
  double most = 0;
  for (int j = 0; j < joint_count; ++j) most = std::max(most, std::fabs(a[j] - b[j]));
  return most;
}

TEST_P(CycleOnBothRobots, RunsOutOfAWalkWithTheGaitGoingOnAndFading) {
  Rig rig("", GetParam());
  rig.stand();
  const int joints = rig.robot.joint_count();
  const JointAngles<> stance = rig.cycle.report().target;
  ASSERT_TRUE(rig.cycle.run(Motion::walk, 1.0).completed);
  const JointAngles<> at_end = rig.cycle.report().target;
  rig.cycle.begin(Motion::settle, 0);
  double beside_the_line = 0;  // on the straight way from the last target to the stance, it would be nothing
  int ticks = 0;
  for (; !rig.cycle.done(); ++ticks) {
    rig.cycle.tick({});
    const JointAngles<> target = rig.cycle.report().target;
    const double t = (ticks + 1) / (rig.robot.robot().settle_s() * 1000);
    const JointAngles<> line = between(at_end, stance, smooth_share(t), joints);
    beside_the_line = std::max(beside_the_line, distance(target, line, joints));
  }
  EXPECT_GT(beside_the_line, 0.05);
  EXPECT_EQ(ticks, std::lround(rig.robot.robot().settle_s() * 1000));
  EXPECT_LT(distance(rig.cycle.report().target, stance, joints), 1e-12);
}

TEST_P(CycleOnBothRobots, GoesOnRunningOutWhenTheSettlingIsAskedForLate) {
  const auto targets = [](int late_ticks) {
    Rig rig("", GetParam());
    rig.stand();
    (void)rig.cycle.run(Motion::walk, 0.9);
    std::vector<double> of_joints;
    const int ticks = static_cast<int>(rig.robot.robot().settle_s() * 1000);
    for (int tick = 0; tick < ticks; ++tick) {
      if (tick == late_ticks) rig.cycle.begin(Motion::settle, 0);
      rig.cycle.tick({});
      for (int j = 0; j < rig.robot.joint_count(); ++j) of_joints.push_back(rig.cycle.report().target[j]);
    }
    EXPECT_TRUE(rig.cycle.done());
    return of_joints;
  };
  const std::vector<double> at_once = targets(0);
  EXPECT_EQ(targets(7), at_once);
  EXPECT_EQ(targets(150), at_once);
}

TEST_P(CycleOnBothRobots, SettlesFromStandingWithoutThePolicy) {
  Rig rig("", GetParam());
  rig.stand();
  (void)rig.cycle.run(Motion::walk, 0.5);
  (void)rig.cycle.run(Motion::settle, 0);
  const JointAngles<> stance = rig.cycle.report().target;
  rig.cycle.begin(Motion::settle, 0);
  while (!rig.cycle.done()) {
    rig.cycle.tick({});
    EXPECT_LT(distance(rig.cycle.report().target, stance, rig.robot.joint_count()), 1e-12);
  }
}

INSTANTIATE_TEST_SUITE_P(Robots, CycleOnBothRobots, testing::Values("dunlin12", "dunlin8"));

TEST(Cycle, ParkedNeverTurnsTorqueOn) {
  Rig rig;
  const std::uint64_t before = rig.cycle.signals().stopped_commands.load();
  (void)rig.cycle.run(Motion::parked, 0.5);
  EXPECT_EQ(rig.cycle.signals().stopped_commands.load() - before, 500U);
}

TEST(Cycle, AStopFlagTripsAtTheNextTickAndEndsTorqueFree) {
  Rig rig;
  rig.stand();
  rig.cycle.begin(Motion::walk, 5);
  for (int tick = 0; tick < 300; ++tick) rig.cycle.tick({});
  ASSERT_EQ(rig.cycle.report().phase, safety::Phase::armed);
  rig.cycle.signals().stop.store(true);
  const std::uint64_t before = rig.cycle.signals().stopped_commands.load();
  rig.cycle.tick({});
  EXPECT_EQ(rig.cycle.report().phase, safety::Phase::damping);
  EXPECT_EQ(rig.cycle.signals().stopped_commands.load(), before + 1);
  int ticks = 0;
  while (!rig.cycle.done() && ticks < 5000) {
    rig.cycle.tick({});
    ++ticks;
  }
  const MotionResult walk = rig.cycle.result();
  EXPECT_TRUE(walk.tripped);
  EXPECT_EQ(walk.outcome, Outcome::voided);
  EXPECT_EQ(walk.trip.cause, safety::Cause::operator_stop);
  EXPECT_EQ(rig.cycle.report().phase, safety::Phase::off);
  EXPECT_LE(ticks, 1500);  // damp_s + lower_s of the robot file are at most 1.5 s
  EXPECT_NEAR(walk.summary.duration_s(), 0.3, 1e-9);
}

TEST(Cycle, AHaltTakesTheTorqueOffAtTheNextTick) {
  Rig rig;
  rig.stand();
  rig.cycle.begin(Motion::walk, 5);
  for (int tick = 0; tick < 100; ++tick) rig.cycle.tick({});
  rig.cycle.signals().halt.store(true);
  rig.cycle.tick({});
  EXPECT_EQ(rig.cycle.report().phase, safety::Phase::off);
  EXPECT_EQ(rig.cycle.report().motion, Motion::parked);
}

TEST(Cycle, ATripKeepsEveryMotionFromBeginning) {
  Rig rig;
  rig.stand();
  rig.cycle.signals().halt.store(true);
  rig.cycle.tick({});
  for (const Motion motion : {Motion::rise, Motion::stand, Motion::walk, Motion::settle, Motion::lower}) {
    const MotionResult result = rig.cycle.run(motion, 1);
    EXPECT_FALSE(result.completed);
    EXPECT_TRUE(result.tripped);
    EXPECT_EQ(rig.cycle.report().motion, Motion::parked);
  }
}

TEST(Cycle, TheBatonIsNotJudgedWithinATickAtSteppedPace) {
  Rig rig;
  rig.stand();
  rig.cycle.signals().baton_lost.store(true);
  EXPECT_TRUE(rig.cycle.run(Motion::walk, 0.2).completed);
}

struct FaultCase {
  const char* kind;
  safety::Cause cause;
  Outcome outcome;
};

class CycleFaults : public testing::TestWithParam<FaultCase> {};

TEST_P(CycleFaults, EndsTheWalkWithItsCause) {
  const Rig timing;
  Rig rig(at_walk(timing, GetParam().kind, 200, 1000));
  rig.stand();
  const MotionResult walk = rig.cycle.run(Motion::walk, 3);
  EXPECT_TRUE(walk.tripped);
  EXPECT_EQ(walk.trip.cause, GetParam().cause) << safety::name(walk.trip.cause);
  EXPECT_EQ(walk.outcome, GetParam().outcome);
  EXPECT_GE(walk.summary.duration_s(), 0.19);
  EXPECT_LT(walk.summary.duration_s(), 0.6);
  EXPECT_EQ(rig.cycle.report().phase, safety::Phase::off);
  EXPECT_EQ(walk.terms.fall, GetParam().outcome == Outcome::fell ? -1.0 : 0.0);
}

INSTANTIATE_TEST_SUITE_P(Faults, CycleFaults,
                         testing::Values(FaultCase{"nan", safety::Cause::frame_not_finite, Outcome::voided},
                                         FaultCase{"lost", safety::Cause::frame_stale, Outcome::voided},
                                         FaultCase{"broken", safety::Cause::bus_error, Outcome::voided},
                                         FaultCase{"mute", safety::Cause::bus_error, Outcome::voided},
                                         FaultCase{"estop", safety::Cause::emergency_stop, Outcome::voided},
                                         // The estimate sees the fall just before the gate's own filter does.
                                         FaultCase{"tilt", safety::Cause::internal_stop, Outcome::fell}),
                         [](const testing::TestParamInfo<FaultCase>& fault) {
                           return std::string(fault.param.kind);
                         });

TEST(Cycle, LeavingTheLaneEndsTheWalkWithoutATrip) {
  files::RobotFile robot = test::shipped_robot("dunlin12");
  v1::Robot narrow = robot.robot();
  narrow.mutable_lane()->set_half_width_m(0.01);
  const files::PolicyFile policy = test::trot_file(robot);
  Cycle cycle(narrow, policy.policy(), test::puppet(robot));
  (void)cycle.run(Motion::parked, 0.1);
  ASSERT_TRUE(cycle.run(Motion::rise, 0).completed);
  const MotionResult walk = cycle.run(Motion::walk, 3);
  EXPECT_EQ(walk.outcome, Outcome::left_lane);
  EXPECT_FALSE(walk.tripped);
  EXPECT_LT(walk.summary.duration_s(), 3);
  EXPECT_TRUE(cycle.run(Motion::settle, 0).completed);
}

TEST(Cycle, ParametersThatAreNoNumbersTripAndNeverReachTheDrives) {
  Rig rig;
  rig.stand();
  Parameters bad(rig.policy.policy().parameters().begin(), rig.policy.policy().parameters().end());
  bad[0] = std::nan("");
  rig.cycle.load(bad);
  const MotionResult walk = rig.cycle.run(Motion::walk, 1);
  EXPECT_EQ(walk.trip.cause, safety::Cause::command_not_finite);
  EXPECT_EQ(walk.outcome, Outcome::voided);
}

TEST(Cycle, AllocatesNothingInTheTicksOfAllMotions) {
  Rig rig;
  (void)rig.cycle.run(Motion::parked, 0.1);
  const std::uint64_t before = test::allocations();
  for (const Motion motion : {Motion::rise, Motion::stand, Motion::walk, Motion::settle, Motion::lower}) {
    rig.cycle.begin(motion, 1);
    while (!rig.cycle.done()) rig.cycle.tick({});
  }
  rig.cycle.begin(Motion::rise, 0);
  rig.cycle.signals().stop.store(true);
  for (int tick = 0; tick < 2000; ++tick) rig.cycle.tick({});
  EXPECT_EQ(test::allocations() - before, 0U);
  EXPECT_EQ(rig.cycle.report().phase, safety::Phase::off);
}

TEST(Cycle, TheCounterOfAllocationsCounts) {
  const std::uint64_t before = test::allocations();
  const std::vector<int> taken(100);
  EXPECT_GT(test::allocations(), before) << taken.size();
}

TEST(Cycle, HeatThatTheCarriedStateDoesNotKnowIsNotAssumedAway) {
  Rig rig;
  v1::CarriedState state;
  for (int j = 0; j + 1 < rig.robot.joint_count(); ++j) state.add_thermal(0.1);
  ASSERT_TRUE(rig.cycle.restore(state, false));
  EXPECT_EQ(rig.cycle.gate().thermal_worst(), 1.0);
  EXPECT_EQ(rig.cycle.gate().thermal_state()[0], 0.1);
}

TEST(Cycle, SameWalkSameBitsAfterSaveAndRestore) {
  Rig first;
  ASSERT_TRUE(first.cycle.drives().carry_back(11));
  first.stand();
  (void)first.cycle.run(Motion::walk, 0.5);
  (void)first.cycle.run(Motion::lower, 0);
  const v1::CarriedState state = first.cycle.save();
  const auto second_walk = [](Cycle& cycle) {
    EXPECT_TRUE(cycle.drives().carry_back(12));
    cycle.set_down();
    (void)cycle.run(Motion::parked, 0.1);
    (void)cycle.run(Motion::rise, 0);
    return cycle.run(Motion::walk, 0.5);
  };
  const MotionResult expected = second_walk(first.cycle);
  Rig other;
  ASSERT_TRUE(other.cycle.restore(state, true));
  const MotionResult found = second_walk(other.cycle);
  EXPECT_EQ(found.terms.total(), expected.terms.total());
  EXPECT_EQ(found.summary.SerializeAsString(), expected.summary.SerializeAsString());
  EXPECT_EQ(other.cycle.report().ticks, first.cycle.report().ticks);
  EXPECT_EQ(other.cycle.save().SerializeAsString(), first.cycle.save().SerializeAsString());
}

}  // namespace
}  // namespace pastern::session
