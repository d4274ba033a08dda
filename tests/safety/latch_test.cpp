// Trips: the first cause stays, harder causes cut a ramp-down short, phases keep their time, release has
// rules.
#include <algorithm>
#include <cmath>

#include "tests/safety/fixture.h"

namespace pastern::safety {
namespace {

using test::kNan;
using test::Loop;

TEST(Latch, TheFirstCauseStaysWithItsNumbers) {
  Loop loop;
  loop.ticks(3);
  loop.frame.speed[1] = 20.5;
  (void)loop.tick();
  const Trip first = loop.gate.trip();
  EXPECT_EQ(first.cause, Cause::joint_speed);
  loop.frame.speed[1] = 0.0;
  loop.flags.stop = true;
  loop.flags.baton_lost = true;
  loop.frame.rate.z = 10.0;
  loop.ticks(500);
  loop.frame.angle[2] = kNan;
  loop.ticks(5);
  const Trip& last = loop.gate.trip();
  EXPECT_EQ(last.cause, first.cause);
  EXPECT_EQ(last.joint, 1);
  EXPECT_EQ(last.value, 20.5);
  EXPECT_EQ(last.limit, 20.0);
  EXPECT_EQ(last.tick, first.tick);
  EXPECT_TRUE(last.time == first.time);
}

TEST(Latch, RampDownDampsLowersAndEndsWithinItsTime) {
  Loop loop;  // damp 100 ticks, lower 200 ticks
  loop.frame.speed[0] = 2.0;
  loop.ticks(3);
  loop.flags.stop = true;
  int damping = 0;
  int lowering = 0;
  double before = 0.0;
  for (int i = 0; i < 400; ++i) {
    loop.frame.angle[0] += i % 2 == 0 ? 0.001 : -0.001;  // a joint that moves has an angle that changes
    const DriveCommand command = loop.tick();
    if (loop.gate.phase() == Phase::damping) {
      ++damping;
      // 4 N m s/rad against 2 rad/s, reached by 5 N m a tick
      EXPECT_NEAR(command.torque()[0], std::max(-8.0, -5.0 * damping), 1e-9);
    } else if (loop.gate.phase() == Phase::lowering) {
      EXPECT_NEAR(command.torque()[0], -8.0 * (200 - lowering) / 200.0, 1e-9);
      ++lowering;
      before = command.torque()[0];
    } else {
      EXPECT_FALSE(command.torque_on());
      EXPECT_EQ(command.torque()[0], 0.0);
    }
  }
  EXPECT_EQ(damping, 100);
  EXPECT_EQ(lowering, 200);
  EXPECT_NEAR(before, -8.0 / 200.0, 1e-9);  // next to nothing is left to cut off
  EXPECT_EQ(loop.gate.phase(), Phase::off);
  EXPECT_EQ(loop.gate.trip().reaction, Reaction::ramp_down);
}

TEST(Latch, AStalledCycleStillEndsItsRampDownInTime) {
  Loop loop;
  loop.ticks(3);
  loop.flags.stop = true;
  (void)loop.tick();
  loop.now.value += 298 * test::kTickNs;
  EXPECT_TRUE(loop.tick().torque_on());  // 299 ticks after the trip
  EXPECT_FALSE(loop.tick().torque_on());
}

TEST(Latch, ARampDownOfNoLengthIsTorqueOff) {
  Limits limits = test::some_limits();
  limits.damp_s = limits.lower_s = 0.0;
  Loop loop(limits);
  loop.ticks(3);
  loop.flags.stop = true;
  EXPECT_FALSE(loop.tick().torque_on());
  EXPECT_EQ(loop.gate.phase(), Phase::off);
  EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);
}

TEST(Latch, EveryCauseDoesWhatTheRobotFileChooses) {
  Limits limits = test::some_limits();
  limits.reaction[static_cast<std::size_t>(Cause::operator_stop)] = Reaction::torque_off;
  Loop loop(limits);
  loop.ticks(3);
  loop.flags.stop = true;
  EXPECT_FALSE(loop.tick().torque_on());
  EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);
}

TEST(Latch, AReactionThatIsNoneOfTheTwoIsTorqueOff) {
  Limits limits = test::some_limits();
  limits.reaction.fill(static_cast<Reaction>(77));
  Loop loop(limits);
  loop.ticks(3);
  loop.flags.internal_stop = true;
  EXPECT_FALSE(loop.tick().torque_on());
}

TEST(Latch, HaltAndEmergencyStopTakeTheTorqueOffWhateverTheRobotFileSays) {
  for (const bool halt : {true, false}) {
    Loop loop;  // every reaction is ramp_down
    loop.wanted[0] = 20.0;
    loop.ticks(10);
    (halt ? loop.flags.halt : loop.frame.emergency_stop) = true;
    const DriveCommand command = loop.tick();
    EXPECT_FALSE(command.torque_on());
    EXPECT_EQ(command.torque()[0], 0.0);
    EXPECT_EQ(loop.gate.phase(), Phase::off);
  }
}

TEST(Latch, AHarderCauseCutsTheRampDownAndLeavesTheRecord) {
  Limits limits = test::some_limits();
  limits.reaction[static_cast<std::size_t>(Cause::joint_speed)] = Reaction::torque_off;
  for (int kind = 0; kind < 7; ++kind) {
    SCOPED_TRACE(kind);
    Loop loop(limits);
    loop.ticks(3);
    loop.flags.stop = true;
    loop.ticks(kind % 2 == 0 ? 50 : 150);  // while damping, while lowering
    EXPECT_EQ(loop.gate.phase(), kind % 2 == 0 ? Phase::damping : Phase::lowering);
    if (kind == 0) loop.flags.halt = true;
    if (kind == 1) loop.frame.emergency_stop = true;
    if (kind == 2) loop.frame.speed[0] = 21.0;
    if (kind == 3) loop.flags.bus_error = true;
    if (kind == 4) loop.frame.speed[2] = kNan;
    if (kind == 5) loop.flags.torque_wanted = false;
    if (kind == 6) loop.frame.speed[2] = 1e308;
    EXPECT_FALSE(loop.tick().torque_on());
    EXPECT_EQ(loop.gate.phase(), Phase::off);
    EXPECT_EQ(loop.gate.trip().cause, Cause::operator_stop);
    EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);
  }
}

TEST(Latch, ASofterCauseDoesNotProlongTheRampDown) {
  Loop loop;
  loop.ticks(3);
  loop.flags.stop = true;
  loop.ticks(150);
  loop.frame.rate.z = 10.0;
  loop.ticks(150);
  EXPECT_EQ(loop.gate.phase(), Phase::lowering);
  (void)loop.tick();
  EXPECT_EQ(loop.gate.phase(), Phase::off);
}

TEST(Latch, TheTrunkMaySinkWhileItIsLowered) {
  Limits limits = test::some_limits();
  limits.reaction[static_cast<std::size_t>(Cause::base_low)] = Reaction::torque_off;
  limits.base_low_hold_s = 0.0;
  Loop loop(limits);
  loop.flags.watch_base = true;
  loop.ticks(3);
  loop.flags.stop = true;
  (void)loop.tick();
  for (int i = 0; i < 100; ++i) {
    loop.frame.angle[0] = std::min(0.5 + 0.02 * i, 1.9);
    (void)loop.tick();
  }
  EXPECT_EQ(loop.gate.phase(), Phase::lowering);
}

TEST(Latch, ReleaseIsRefusedWhileArmedOrStillStopping) {
  Loop loop;
  loop.ticks(3);
  EXPECT_FALSE(loop.gate.release());
  loop.flags.stop = true;
  loop.ticks(50);
  EXPECT_FALSE(loop.gate.release());
  loop.flags.stop = false;
  loop.ticks(50);
  EXPECT_FALSE(loop.gate.release());
}

TEST(Latch, ReleaseIsRefusedWhileTorqueIsWantedOrTheCauseIsThere) {
  Loop loop;
  loop.ticks(3);
  loop.flags.halt = true;
  loop.ticks(3);
  loop.flags.torque_wanted = false;
  (void)loop.tick();
  EXPECT_FALSE(loop.gate.release());  // halt still set
  loop.flags.halt = false;
  loop.flags.torque_wanted = true;
  (void)loop.tick();
  EXPECT_FALSE(loop.gate.release());  // it would start by itself
  loop.flags.torque_wanted = false;
  loop.frame.emergency_stop = true;
  (void)loop.tick();
  EXPECT_FALSE(loop.gate.release());
  loop.frame.emergency_stop = false;
  loop.frame.winding[0] = 95.0;
  (void)loop.tick();
  EXPECT_FALSE(loop.gate.release());
  loop.frame.winding[0] = 30.0;
  EXPECT_FALSE(loop.gate.release());  // not judged yet
  (void)loop.tick();
  EXPECT_TRUE(loop.gate.release());
  EXPECT_EQ(loop.gate.phase(), Phase::armed);
  EXPECT_EQ(loop.gate.trip().cause, Cause::none);
}

TEST(Latch, AFallenRobotCanBeReleasedOnceTorqueIsNoLongerWanted) {
  Loop loop;
  loop.frame.acceleration = {0.0, kGravity, 0.0};  // on its side
  loop.ticks(400);
  EXPECT_EQ(loop.gate.trip().cause, Cause::roll);
  loop.flags.torque_wanted = false;
  (void)loop.tick();
  EXPECT_TRUE(loop.gate.release());
  loop.ticks(100);
  EXPECT_EQ(loop.gate.phase(), Phase::armed);
  loop.flags.torque_wanted = true;  // still on its side: no torque
  EXPECT_FALSE(loop.tick().torque_on());
  EXPECT_EQ(loop.gate.trip().cause, Cause::roll);
}

TEST(Latch, TorqueStaysOffUntilReleased) {
  Loop loop;
  loop.ticks(3);
  loop.flags.halt = true;
  (void)loop.tick();
  loop.flags.halt = false;
  loop.wanted[0] = 10.0;
  for (int i = 0; i < 2000; ++i) EXPECT_FALSE(loop.tick().torque_on());
}

TEST(Latch, ResetFiltersForgetsTheFrameButNotTheTripOrTheHeat) {
  Loop loop;
  PerJoint<Celsius> heat;
  heat[1] = 0.7;
  loop.gate.restore_thermal_state(heat);
  loop.frame.counter = 500;
  loop.ticks(3);
  loop.flags.halt = true;
  (void)loop.tick();
  loop.flags.halt = false;
  loop.gate.reset_filters();
  EXPECT_EQ(loop.gate.phase(), Phase::off);
  EXPECT_EQ(loop.gate.trip().cause, Cause::operator_halt);
  EXPECT_NEAR(loop.gate.thermal_worst(), 0.7, 1e-3);
  EXPECT_NEAR(std::fabs(loop.gate.roll_rad()), 3.14159265, 1e-6);
  // The counter may start anew, joints may stand elsewhere.
  loop.flags.torque_wanted = false;
  loop.frame.counter = 0;
  loop.frame.angle[0] = -0.5;
  (void)loop.tick();
  EXPECT_TRUE(loop.gate.release());
  loop.flags.torque_wanted = true;
  EXPECT_EQ(loop.ticks_to_trip(100), 101);
}

TEST(Latch, ThermalStateCarriesOverARestart) {
  Loop hot;
  PerJoint<Celsius> heat;
  heat[2] = 0.95;
  hot.gate.restore_thermal_state(heat);
  (void)hot.tick();
  EXPECT_EQ(hot.gate.hold(), Hold::thermal_model);
  Loop next;
  next.gate.restore_thermal_state(hot.gate.thermal_state());
  EXPECT_EQ(next.gate.thermal_worst(), hot.gate.thermal_worst());
}

TEST(Latch, CommandsCarryTheTickOfTheTrip) {
  Loop loop;
  loop.ticks(7);
  loop.flags.stop = true;
  const DriveCommand command = loop.tick();
  EXPECT_EQ(command.tick(), 8U);
  EXPECT_EQ(loop.gate.trip().tick, 8U);
  EXPECT_EQ(command.joint_count(), 3);
}

}  // namespace
}  // namespace pastern::safety
