// Every watch: silent at its limit, trips just beyond it, after its hold time to the tick, with its numbers.
#include <algorithm>
#include <cmath>
#include <functional>
#include <string>
#include <vector>

#include "tests/safety/fixture.h"

namespace pastern::safety {
namespace {

using test::kInf;
using test::kNan;
using test::Loop;

void level_by(Loop& loop, double roll, double pitch) {
  loop.frame.acceleration = {-kGravity * std::sin(pitch), kGravity * std::cos(pitch) * std::sin(roll),
                             kGravity * std::cos(pitch) * std::cos(roll)};
}

/// A condition, its limit, and how many ticks it must last. `set` puts the watched quantity to a value.
struct Watch {
  Cause cause;
  int joint;
  double limit;
  double just_beyond;
  int hold_ticks;
  std::function<void(Loop&, double)> set;
};

std::vector<Watch> watches() {
  const auto above = [](double x) { return std::nextafter(x, kInf); };
  const auto below = [](double x) { return std::nextafter(x, -kInf); };
  return {
      {Cause::body_rate, -1, 6.0, above(6.0), 30, [](Loop& l, double x) { l.frame.rate.z = x; }},
      {Cause::measured_torque, 1, 40.0, above(40.0), 20, [](Loop& l, double x) { l.frame.torque[1] = x; }},
      {Cause::measured_torque, 2, 40.0, -above(40.0), 20, [](Loop& l, double x) { l.frame.torque[2] = x; }},
      {Cause::joint_position, 2, 2.0, above(2.0), 0, [](Loop& l, double x) { l.frame.angle[2] = x; }},
      {Cause::joint_position, 2, -1.0, below(-1.0), 0, [](Loop& l, double x) { l.frame.angle[2] = x; }},
      {Cause::joint_speed, 0, 20.0, above(20.0), 0, [](Loop& l, double x) { l.frame.speed[0] = x; }},
      {Cause::joint_speed, 0, 20.0, -above(20.0), 0, [](Loop& l, double x) { l.frame.speed[0] = x; }},
      {Cause::pack_voltage_low, -1, 36.0, below(36.0), 25,
       [](Loop& l, double x) { l.frame.pack_voltage_v = x; }},
      {Cause::pack_current_high, -1, 60.0, above(60.0), 25,
       [](Loop& l, double x) { l.frame.pack_current_a = x; }},
      {Cause::pack_current_high, -1, 60.0, -above(60.0), 25,
       [](Loop& l, double x) { l.frame.pack_current_a = x; }},
      {Cause::tick_overrun, -1, 0.010, above(0.010), 0, [](Loop& l, double x) { l.late_s = x; }},
      {Cause::frame_out_of_range, -1, 30.0, above(30.0), 0, [](Loop& l, double x) { l.frame.rate.x = x; }},
      {Cause::frame_out_of_range, -1, -160.0, below(-160.0), 0,
       [](Loop& l, double x) { l.frame.acceleration.y = x; }},
      {Cause::frame_out_of_range, 1, 400.0, above(400.0), 0,
       [](Loop& l, double x) { l.frame.torque[1] = x; }},
      {Cause::frame_out_of_range, 1, 500.0, above(500.0), 0,
       [](Loop& l, double x) { l.frame.housing[1] = x; }},
      {Cause::frame_out_of_range, -1, 0.0, below(0.0), 0,
       [](Loop& l, double x) { l.frame.pack_voltage_v = x; }},
  };
}

Limits without_jumps() {
  Limits limits = test::some_limits();
  limits.frame_jump_rad = 100.0;  // these tests move joints at will
  return limits;
}

TEST(Watches, AreSilentAtTheirLimit) {
  for (const Watch& watch : watches()) {
    Loop loop(without_jumps());
    loop.ticks(3);
    const bool falling = watch.just_beyond < 0.0 && watch.limit > 0.0;  // a limit of both directions
    watch.set(loop, falling ? -watch.limit : watch.limit);
    if (watch.cause == Cause::frame_out_of_range) {
      // What is barely possible is beyond the robot's own limits; only this cause must stay silent.
      (void)loop.tick();
      EXPECT_NE(loop.gate.trip().cause, Cause::frame_out_of_range);
      continue;
    }
    EXPECT_EQ(loop.ticks_to_trip(200), 201) << name(watch.cause);
  }
}

TEST(Watches, TripJustBeyondAfterTheirHoldTimeToTheTick) {
  for (const Watch& watch : watches()) {
    SCOPED_TRACE(std::string(name(watch.cause)) + " " + std::to_string(watch.just_beyond));
    Loop loop(without_jumps());
    loop.ticks(3);
    watch.set(loop, watch.just_beyond);
    EXPECT_EQ(loop.ticks_to_trip(500), watch.hold_ticks + 1);  // the first tick beyond counts 0
    const Trip& trip = loop.gate.trip();
    EXPECT_EQ(trip.cause, watch.cause);
    EXPECT_EQ(trip.joint, watch.joint);
    EXPECT_NEAR(trip.value, watch.just_beyond, 1e-9);
    EXPECT_NEAR(trip.limit, watch.limit, 1e-9);
    EXPECT_NEAR(trip.held_s, watch.hold_ticks * test::kTick, 1e-12);
    EXPECT_EQ(trip.tick, static_cast<std::uint64_t>(3 + watch.hold_ticks + 1));
    EXPECT_EQ(trip.time.value, (3 + watch.hold_ticks + 1) * test::kTickNs);
    EXPECT_EQ(trip.reaction, Reaction::ramp_down);
  }
}

TEST(Watches, ABreakOfOneTickStartsTheHoldAnew) {
  for (const Watch& watch : watches()) {
    if (watch.hold_ticks == 0) continue;
    SCOPED_TRACE(name(watch.cause));
    Loop loop(without_jumps());
    loop.ticks(3);
    watch.set(loop, watch.just_beyond);
    EXPECT_EQ(loop.ticks_to_trip(watch.hold_ticks), watch.hold_ticks + 1);  // one short of the hold
    watch.set(loop, watch.cause == Cause::pack_voltage_low ? 46.0 : 0.0);
    EXPECT_EQ(loop.ticks_to_trip(1), 2);
    watch.set(loop, watch.just_beyond);
    EXPECT_EQ(loop.ticks_to_trip(500), watch.hold_ticks + 1);
  }
}

TEST(Watches, AStalledCycleCountsTheTicksThatItMissedTowardsTheHold) {
  Loop loop(without_jumps());
  loop.ticks(3);
  loop.frame.rate.z = 7.0;
  (void)loop.tick();
  loop.now.value += 28 * test::kTickNs;  // the next tick comes 29 after
  EXPECT_EQ(loop.ticks_to_trip(10), 2);  // 29 ticks held, then 30
}

struct Lean {
  Cause cause;
  double roll;
  double pitch;
  int hold_ticks;  // -1: never
};

TEST(Watches, TiltTripsAfterItsHoldAndAtOnceWhenLarge) {
  for (const Lean& lean : {Lean{Cause::roll, 0.599, 0.0, -1}, Lean{Cause::roll, 0.601, 0.0, 50},
                           Lean{Cause::roll, -0.601, 0.0, 50}, Lean{Cause::pitch, 0.0, 0.599, -1},
                           Lean{Cause::pitch, 0.0, 0.601, 50}, Lean{Cause::pitch, 0.0, -0.601, 50},
                           Lean{Cause::roll, 0.899, 0.0, 50}, Lean{Cause::roll, 0.901, 0.0, 0},
                           Lean{Cause::roll, -0.901, 0.0, 0}, Lean{Cause::pitch, 0.0, 0.901, 0},
                           Lean{Cause::pitch, 0.0, -1.5, 0}, Lean{Cause::roll, 3.1, 0.0, 0}}) {
    SCOPED_TRACE(std::to_string(lean.roll) + " " + std::to_string(lean.pitch));
    Loop loop;
    level_by(loop, lean.roll, lean.pitch);  // the first frame: the filter starts there
    EXPECT_EQ(loop.ticks_to_trip(300), lean.hold_ticks < 0 ? 301 : lean.hold_ticks + 1);
    if (lean.hold_ticks >= 0) {
      EXPECT_EQ(loop.gate.trip().cause, lean.cause);
      EXPECT_NEAR(loop.gate.trip().value, lean.cause == Cause::roll ? lean.roll : lean.pitch, 1e-9);
    }
  }
}

TEST(Watches, AJointParkedAgainstItsEndStopMayComeInButNotGoOut) {
  // Range -1 .. 2, soft edge 0.1 rad. Found beyond the edge by less than that: no trip, no outward torque.
  for (const double edge : {-1.0, 2.0}) {
    const double out = edge < 0.0 ? -1.0 : 1.0;
    Loop loop(without_jumps());
    loop.flags.torque_wanted = false;
    loop.frame.angle[1] = edge + 0.09 * out;
    loop.ticks(5);
    loop.flags.torque_wanted = true;
    loop.wanted[1] = 4.0 * out;
    EXPECT_EQ(loop.tick().torque()[1], 0.0);
    loop.wanted[1] = -4.0 * out;
    EXPECT_EQ(loop.tick().torque()[1], -4.0 * out);
    EXPECT_EQ(loop.ticks_to_trip(50), 51);
    loop.frame.angle[1] = edge + 0.11 * out;  // farther out
    EXPECT_EQ(loop.ticks_to_trip(5), 1);
    EXPECT_EQ(loop.gate.trip().cause, Cause::joint_position);
    EXPECT_EQ(loop.gate.trip().limit, edge);
  }
}

TEST(Watches, OnceClearOfItsSoftEdgeAJointMayNotGoBeyondItsHardEdgeAgain) {
  Loop loop(without_jumps());
  for (const double angle : {2.05, 1.99, 2.01, 1.91, 2.05}) {  // chatters about the stop, not clear yet
    loop.frame.angle[1] = angle;
    EXPECT_EQ(loop.ticks_to_trip(5), 6) << angle;
  }
  loop.frame.angle[1] = 1.9;
  EXPECT_EQ(loop.ticks_to_trip(1), 2);
  loop.frame.angle[1] = 2.0;
  EXPECT_EQ(loop.ticks_to_trip(1), 2);
  loop.frame.angle[1] = std::nextafter(2.0, 3.0);
  EXPECT_EQ(loop.ticks_to_trip(5), 1);
  EXPECT_EQ(loop.gate.trip().cause, Cause::joint_position);
}

TEST(Watches, ParkingGivesTheWayInAnew) {
  Loop loop(without_jumps());
  loop.ticks(3);  // clear
  loop.flags.torque_wanted = false;
  loop.frame.angle[1] = 2.05;
  loop.ticks(3);
  loop.flags.torque_wanted = true;
  EXPECT_EQ(loop.ticks_to_trip(50), 51);
}

TEST(Watches, AJointParkedFarBeyondItsEdgeDoesNotStart) {
  Loop loop(without_jumps());
  loop.frame.angle[1] = 2.101;
  EXPECT_EQ(loop.ticks_to_trip(5), 1);
  EXPECT_EQ(loop.gate.phase(), Phase::off);
}

TEST(Watches, BodyRateIsTheSizeOfTheWholeVector) {
  Loop loop;
  loop.frame.rate = {-4.0, 4.0, 2.0};  // 6 rad/s exactly: the limit; too short to tilt far
  EXPECT_EQ(loop.ticks_to_trip(40), 41);
  loop.frame.rate = {4.0, -4.0, -2.001};
  EXPECT_EQ(loop.ticks_to_trip(200), 31);
  EXPECT_EQ(loop.gate.trip().cause, Cause::body_rate);
}

TEST(Watches, ADeadAccelerometerCountsAsUpsideDown) {
  Loop loop;
  loop.frame.acceleration = {};
  EXPECT_EQ(loop.ticks_to_trip(5), 1);
  EXPECT_EQ(loop.gate.trip().cause, Cause::roll);
}

TEST(Watches, ALowTrunkTripsOnlyWhenItIsMeantToBeUp) {
  // Two links of 0.25 m: height 0.25 (cos hip + cos(hip + knee)); limit 0.20 m for 40 ticks.
  const double hip = std::acos(0.4);  // both links at this angle to the vertical: 0.2 m
  for (const double sink : {-1e-9, 1e-6}) {
    for (const bool watched : {false, true}) {
      Limits limits = without_jumps();
      limits.joint[0].angle_max_rad = limits.joint[1].angle_max_rad = 3.0;
      Loop loop(limits);
      loop.flags.watch_base = watched;
      loop.frame.angle[0] = hip + sink;
      const bool trips = watched && sink > 0.0;
      EXPECT_EQ(loop.ticks_to_trip(200), trips ? 41 : 201);
      if (trips) {
        EXPECT_EQ(loop.gate.trip().cause, Cause::base_low);
      }
    }
  }
}

TEST(Watches, WindingsTripAtTheirLimitAndWarmOnesForbidANewEpisode) {
  Loop loop;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.hold(), Hold::none);
  loop.frame.winding[2] = std::nextafter(60.0, 0.0);
  (void)loop.tick();
  EXPECT_EQ(loop.gate.hold(), Hold::none);
  loop.frame.winding[2] = 60.0;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.hold(), Hold::winding_warm);
  loop.frame.winding[2] = std::nextafter(90.0, 0.0);
  EXPECT_EQ(loop.ticks_to_trip(100), 101);
  loop.frame.winding[2] = 90.0;
  EXPECT_EQ(loop.ticks_to_trip(1), 1);
  EXPECT_EQ(loop.gate.trip().cause, Cause::winding_temperature);
  EXPECT_EQ(loop.gate.trip().joint, 2);
  EXPECT_EQ(loop.gate.hold(), Hold::tripped);
}

TEST(Watches, TheThermalModelForbidsNewEpisodesAndThenTripsAtTheTimeOfIec60255) {
  // I / (k IB) = 1.5 / 1.05 from cold: t = .673345 tau (see thermal_test.cpp). Hold from theta = 0.9.
  Limits limits = test::some_limits();
  limits.joint[1].thermal_tau_s = 2.0;
  limits.joint[1].trip_torque_nm = 60.0;
  Loop loop(limits);
  const double load = 1.5 / 1.05;
  loop.frame.torque[1] = load * 12.0;
  const int to_limit = static_cast<int>(std::ceil(.673345 * 2000.0));
  const int to_hold = static_cast<int>(std::ceil(2000.0 * std::log(load * load / (load * load - 0.9))));
  loop.ticks(to_hold - 2);
  EXPECT_EQ(loop.gate.hold(), Hold::none);
  loop.ticks(4);
  EXPECT_EQ(loop.gate.hold(), Hold::thermal_model);
  const int more = loop.ticks_to_trip(1000);
  EXPECT_NEAR(to_hold + 2 + more, to_limit, 2);
  EXPECT_EQ(loop.gate.trip().cause, Cause::thermal_model);
  EXPECT_EQ(loop.gate.trip().joint, 1);
}

TEST(Watches, ALowPackForbidsANewEpisodeAndSoDoesAnUnknownOne) {
  Loop loop;
  EXPECT_EQ(loop.gate.hold(), Hold::pack_floor);  // no frame yet
  loop.frame.pack_voltage_v = 40.0;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.hold(), Hold::none);
  loop.frame.pack_voltage_v = 39.99;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.hold(), Hold::pack_floor);
}

TEST(Watches, AStaleFrameTripsAfterItsTimeWhetherFlaggedOrRepeated) {
  for (const bool flagged : {true, false}) {
    Loop loop;
    loop.ticks(5);
    if (flagged) loop.flags.frame_new = false;
    int ticks = 0;
    while (loop.gate.phase() == Phase::armed && ticks < 50) {
      ++ticks;
      if (!flagged) --loop.frame.counter;  // tick() raises it again: the same number
      (void)loop.tick();
    }
    EXPECT_EQ(ticks, 6);  // 5 ms are allowed, the sixth is beyond
    EXPECT_EQ(loop.gate.trip().cause, Cause::frame_stale);
    EXPECT_NEAR(loop.gate.trip().value, 0.006, 1e-12);
    EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);  // no speeds to damp by
  }
}

TEST(Watches, ACounterThatGoesBackIsNotANewFrame) {
  Loop loop;
  loop.frame.counter = 1000;
  loop.ticks(5);
  loop.frame.counter = 10;
  EXPECT_EQ(loop.ticks_to_trip(20), 6);
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_stale);
}

TEST(Watches, AFrameWithAnOldCounterIsJudgedForJumpsAllTheSame) {
  Loop loop;
  loop.ticks(5);
  loop.frame.counter -= 2;  // the loop counts one up: the plug-in gives the frame before the last again
  loop.frame.angle[1] = 0.5;
  (void)loop.tick();
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_jump);
  EXPECT_EQ(loop.gate.trip().joint, 1);
}

TEST(Watches, AFrozenFrameTripsAfterItsTicks) {
  Loop loop;
  loop.ticks(5);
  int ticks = 0;
  const double housing = loop.frame.housing[0];
  while (loop.gate.phase() == Phase::armed && ticks < 50) {
    ++ticks;
    ++loop.frame.counter;
    loop.now.value += test::kTickNs;
    loop.frame.housing[0] = housing;
    (void)loop.gate.judge(loop.frame, loop.wanted, loop.target, loop.flags, loop.now, 0.0);
  }
  EXPECT_EQ(ticks, 10);
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_frozen);
  EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);
}

TEST(Watches, AnyOneChangingValueKeepsAFrameAlive) {
  const std::vector<std::function<void(SensorFrame&, double)>> values{
      [](SensorFrame& f, double x) { f.angle[2] = x; },
      [](SensorFrame& f, double x) { f.speed[1] = x; },
      [](SensorFrame& f, double x) { f.torque[0] = x; },
      [](SensorFrame& f, double x) { f.winding[2] = 30.0 + x; },
      [](SensorFrame& f, double x) { f.housing[1] = 30.0 + x; },
      [](SensorFrame& f, double x) { f.rate.y = x; },
      [](SensorFrame& f, double x) { f.acceleration.z = kGravity + x; },
      [](SensorFrame& f, double x) { f.pack_voltage_v = 46.0 + x; },
      [](SensorFrame& f, double x) { f.pack_current_a = 5.0 + x; },
  };
  for (const auto& set : values) {
    Loop loop;
    for (int i = 0; i < 100; ++i) {
      ++loop.frame.counter;
      loop.now.value += test::kTickNs;
      set(loop.frame, i % 2 == 0 ? 0.0 : 1e-6);
      (void)loop.gate.judge(loop.frame, loop.wanted, loop.target, loop.flags, loop.now, 0.0);
    }
    EXPECT_EQ(loop.gate.phase(), Phase::armed);
  }
}

TEST(Watches, AJumpTripsAtOnceAndNamesTheJoint) {
  for (const double jump : {0.1999, -0.1999, 0.2001, -0.2001}) {
    Loop loop;
    loop.ticks(3);
    loop.frame.angle[1] += jump;
    const bool trips = std::fabs(jump) > 0.2;
    EXPECT_EQ(loop.ticks_to_trip(5), trips ? 1 : 6);
    if (trips) {
      EXPECT_EQ(loop.gate.trip().cause, Cause::frame_jump);
      EXPECT_EQ(loop.gate.trip().joint, 1);
      EXPECT_NEAR(loop.gate.trip().value, 0.2001, 1e-9);
    }
  }
}

TEST(Watches, AFrameOfAnotherJointCountIsImpossible) {
  Loop loop;
  loop.ticks(3);
  loop.frame.joint_count = 4;
  EXPECT_EQ(loop.ticks_to_trip(5), 1);
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_out_of_range);
}

TEST(Watches, AnAttitudeThatIsNoRotationIsImpossible) {
  Loop loop;
  loop.frame.has_attitude = true;
  EXPECT_EQ(loop.ticks_to_trip(5), 6);
  loop.frame.attitude = {0.5, -0.5, 0.5, -0.5};
  EXPECT_EQ(loop.ticks_to_trip(5), 6);
  loop.frame.attitude = {0.5, -0.5, 0.5, -0.3};
  EXPECT_EQ(loop.ticks_to_trip(5), 1);
  EXPECT_EQ(loop.gate.trip().cause, Cause::frame_out_of_range);
}

TEST(Watches, EveryFlagTripsWithItsCause) {
  struct Case {
    Cause cause;
    Reaction reaction;
    std::function<void(Loop&)> set;
  };
  const std::vector<Case> cases{
      {Cause::operator_stop, Reaction::ramp_down, [](Loop& l) { l.flags.stop = true; }},
      {Cause::operator_halt, Reaction::torque_off, [](Loop& l) { l.flags.halt = true; }},
      {Cause::baton_lost, Reaction::ramp_down, [](Loop& l) { l.flags.baton_lost = true; }},
      {Cause::internal_stop, Reaction::ramp_down, [](Loop& l) { l.flags.internal_stop = true; }},
      {Cause::bus_error, Reaction::torque_off, [](Loop& l) { l.flags.bus_error = true; }},
      {Cause::emergency_stop, Reaction::torque_off, [](Loop& l) { l.frame.emergency_stop = true; }},
  };
  for (const Case& c : cases) {
    SCOPED_TRACE(name(c.cause));
    Loop loop;
    loop.ticks(3);
    c.set(loop);
    const DriveCommand command = loop.tick();
    EXPECT_EQ(loop.gate.trip().cause, c.cause);
    EXPECT_EQ(loop.gate.trip().reaction, c.reaction);
    EXPECT_EQ(command.torque_on(), c.reaction == Reaction::ramp_down);
  }
}

TEST(Watches, WhileParkedTheRobotMayBeCarriedAndNobodyNeedHoldIt) {
  Loop loop;
  loop.flags.torque_wanted = false;
  loop.flags.baton_lost = true;
  loop.late_s = 1.0;
  loop.wanted[0] = kNan;
  loop.target[0] = kNan;
  loop.frame.rate = {9.0, 0.0, 0.0};
  loop.frame.torque[0] = 45.0;
  for (int i = 0; i < 200; ++i) {
    level_by(loop, i * 0.02, 0.0);
    loop.frame.angle[1] = i % 2 == 0 ? 0.0 : 2.5;
    loop.frame.speed[1] = 25.0;
    EXPECT_FALSE(loop.tick().torque_on());
  }
  EXPECT_EQ(loop.gate.phase(), Phase::armed);
  EXPECT_EQ(loop.gate.trip().cause, Cause::none);
}

TEST(Watches, WhileParkedTheOthersStillTrip) {
  const std::vector<std::function<void(Loop&)>> sets{
      [](Loop& l) { l.flags.stop = true; },           [](Loop& l) { l.flags.halt = true; },
      [](Loop& l) { l.flags.internal_stop = true; },  [](Loop& l) { l.flags.bus_error = true; },
      [](Loop& l) { l.frame.emergency_stop = true; }, [](Loop& l) { l.frame.pack_voltage_v = 1.0; },
      [](Loop& l) { l.frame.pack_current_a = 70.0; }, [](Loop& l) { l.frame.winding[0] = 95.0; },
      [](Loop& l) { l.frame.angle[0] = kNan; },       [](Loop& l) { l.frame.rate.x = 31.0; },
      [](Loop& l) { l.flags.frame_new = false; },
  };
  for (const auto& set : sets) {
    Loop loop;
    loop.flags.torque_wanted = false;
    loop.ticks(3);
    set(loop);
    EXPECT_LE(loop.ticks_to_trip(100), 30);
    EXPECT_EQ(loop.gate.phase(), Phase::off);
    EXPECT_EQ(loop.gate.trip().reaction, Reaction::torque_off);
  }
}

TEST(Watches, AParkedRobotWaitsForItsFirstFrameWithoutATrip) {
  Loop loop;
  loop.flags.torque_wanted = false;
  loop.flags.frame_new = false;
  loop.frame = SensorFrame{};
  loop.ticks(1000);
  EXPECT_EQ(loop.gate.phase(), Phase::armed);
  EXPECT_NE(loop.gate.hold(), Hold::none);
  loop.flags.torque_wanted = true;  // but never starts without one
  EXPECT_EQ(loop.ticks_to_trip(1), 1);
  EXPECT_EQ(loop.gate.phase(), Phase::off);
}

}  // namespace
}  // namespace pastern::safety
