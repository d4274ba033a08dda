// The cycle thread and its queues. What it does, not how fast: no times are asserted.
#include <gtest/gtest.h>

#include <chrono>
#include <thread>

#include "tests/runtime/session/setting.h"

namespace pastern::session {
namespace {

// A machine under load stalls a thread for longer than any robot's overrun limit; that is not what is tested.
files::RobotFile patient_robot(v1::Robot& robot) {
  files::RobotFile file = test::shipped_robot("dunlin8");
  robot = file.robot();
  robot.mutable_guard()->set_overrun_s(0.5);
  robot.mutable_guard()->set_frame_stale_s(0.5);
  robot.set_rise_s(0.3);
  robot.set_settle_s(0.1);
  return file;
}

struct Rig {
  explicit Rig(const std::string& fault = "")
      : file(patient_robot(robot)),
        policy(test::trot_file(file)),
        cycle(robot, policy.policy(), test::puppet(file, fault, Pace::wall), Pace::wall),
        mover(make_wall_mover(cycle, {})) {}

  v1::Robot robot;
  files::RobotFile file;
  files::PolicyFile policy;
  Cycle cycle;
  std::unique_ptr<Mover> mover;
};

TEST(WallMover, TicksWithoutOrdersAndSaysHowItIsScheduled) {
  Rig rig;
  const std::uint64_t before = rig.mover->report().ticks;
  while (rig.mover->report().ticks < before + 20) std::this_thread::sleep_for(std::chrono::milliseconds(1));
  EXPECT_EQ(rig.mover->report().motion, Motion::parked);
  EXPECT_NE(rig.mover->scheduling().find("SCHED_FIFO"), std::string::npos);
}

TEST(WallMover, WalksAWholeWalkAndServesMeanwhile) {
  Rig rig;
  std::string words;
  ASSERT_TRUE(rig.mover->set_down(5, words)) << words;
  int served = 0;
  const auto serve = [&served] { ++served; };
  (void)rig.mover->move(Motion::parked, 0.05, serve);
  ASSERT_TRUE(rig.mover->move(Motion::rise, 0, serve).completed);
  ASSERT_TRUE(rig.mover->move(Motion::stand, 0.05, serve).completed);
  const MotionResult walk = rig.mover->move(Motion::walk, 0.3, serve);
  EXPECT_TRUE(walk.completed) << safety::name(walk.trip.cause);
  EXPECT_NEAR(walk.summary.duration_s(), 0.3, 1e-9);
  EXPECT_TRUE(rig.mover->move(Motion::settle, 0, serve).completed);
  EXPECT_TRUE(rig.mover->move(Motion::lower, 0, serve).completed);
  EXPECT_EQ(rig.mover->report().motion, Motion::parked);
  EXPECT_GT(served, 0);
}

TEST(WallMover, StandsByItselfBetweenOrders) {
  Rig rig;
  (void)rig.mover->move(Motion::parked, 0.05, {});
  ASSERT_TRUE(rig.mover->move(Motion::rise, 0, {}).completed);
  std::this_thread::sleep_for(std::chrono::milliseconds(50));
  EXPECT_EQ(rig.mover->report().motion, Motion::stand);
  EXPECT_EQ(rig.mover->report().phase, safety::Phase::armed);
}

TEST(WallMover, AStopFromAnotherThreadEndsTheWalkAndIsReleased) {
  Rig rig;
  (void)rig.mover->move(Motion::parked, 0.05, {});
  ASSERT_TRUE(rig.mover->move(Motion::rise, 0, {}).completed);
  std::thread other([&rig] {
    std::this_thread::sleep_for(std::chrono::milliseconds(60));
    rig.mover->signals().stop.store(true);
  });
  const MotionResult walk = rig.mover->move(Motion::walk, 20, {});
  other.join();
  EXPECT_TRUE(walk.tripped);
  EXPECT_EQ(walk.trip.cause, safety::Cause::operator_stop);
  EXPECT_EQ(rig.mover->report().phase, safety::Phase::off);
  std::string words;
  EXPECT_FALSE(rig.mover->release(words)) << "the stop is still set";
  EXPECT_TRUE(clear_stops(rig.mover->signals(), 0));
  EXPECT_TRUE(rig.mover->release(words)) << words;
  EXPECT_EQ(rig.mover->report().phase, safety::Phase::armed);
  EXPECT_FALSE(rig.mover->release(words));
  EXPECT_EQ(words, "nothing has tripped");
}

TEST(WallMover, FramesThatAreNewButOldAreStale) {
  for (const char* late : {"late=700", "late=-700"}) {  // its frames are stale from 500 ms on
    Rig rig(late);
    (void)rig.mover->move(Motion::parked, 0.05, {});
    MotionResult held = rig.mover->move(Motion::rise, 0, {});
    if (!held.tripped) held = rig.mover->move(Motion::stand, 5, {});
    EXPECT_TRUE(held.tripped);
    EXPECT_EQ(held.trip.cause, safety::Cause::frame_stale);
  }
  Rig rig("late=5");  // a bus may take its time
  (void)rig.mover->move(Motion::parked, 0.05, {});
  EXPECT_TRUE(rig.mover->move(Motion::rise, 0, {}).completed);
}

TEST(WallMover, AReleaseClearsOnlyTheStopsThatItsOperatorHadSeen) {
  Signals signals;
  signals.stops_asked = 1;
  signals.stop = true;
  signals.internal_stop = true;
  EXPECT_FALSE(clear_stops(signals, 0)) << "a stop came after the release was asked for";
  EXPECT_TRUE(signals.stop);
  EXPECT_TRUE(signals.internal_stop);
  EXPECT_TRUE(clear_stops(signals, 1));
  EXPECT_FALSE(signals.stop);
  EXPECT_FALSE(signals.internal_stop);
}

TEST(WallMover, WhenItGoesAStandingRobotIsLoweredFirst) {
  Rig rig;
  (void)rig.mover->move(Motion::parked, 0.05, {});
  ASSERT_TRUE(rig.mover->move(Motion::rise, 0, {}).completed);
  rig.mover.reset();
  EXPECT_EQ(rig.cycle.gate().phase(), safety::Phase::off);
  EXPECT_EQ(rig.cycle.gate().trip().cause, safety::Cause::internal_stop);
}

TEST(WallMover, ALostBatonStopsARobotThatMoves) {
  Rig rig;
  (void)rig.mover->move(Motion::parked, 0.05, {});
  rig.mover->signals().baton_lost.store(true);
  (void)rig.mover->move(Motion::parked, 0.05, {});
  EXPECT_EQ(rig.mover->report().phase, safety::Phase::armed);  // parked: nothing to stop
  const MotionResult rise = rig.mover->move(Motion::rise, 0, {});
  EXPECT_EQ(rise.trip.cause, safety::Cause::baton_lost);
}

}  // namespace
}  // namespace pastern::session
