// A campaign against the gate: many short lives of robots with limits of all kinds, mostly well, whose
// frames, wishes, clocks and flags are spoilt with structure: one field at a time, for a while, with numbers
// that are hard on comparisons. Judged by an oracle that shares no code with the gate.
#include <gtest/gtest.h>

#include <algorithm>
#include <string>
#include <vector>

#include "tests/safety/fixture.h"
#include "tests/safety/hard_numbers.h"
#include "tests/safety/oracle.h"

namespace pastern::safety {
namespace {

using test::Dice;
using test::Input;
using test::Oracle;

constexpr int kLives = 500;
constexpr int kTicksOfALife = 800;

/// Limits: usually those of a robot, some of them extreme or senseless.
Limits some_robot(Dice& dice) {
  Limits limits = test::some_limits(dice.one_in(8) ? dice.below(kMaxJoints + 1) : 1 + dice.below(6));
  limits.tilt_at_once_rad = 3.2;  // wild accelerations belong here; tilt has tests of its own
  limits.tilt_rad = 3.2;
  limits.damp_s = dice.between(0.0, 0.06);
  limits.lower_s = dice.between(0.0, 0.06);
  limits.frame_jump_rad = 3.0;
  for (auto& reaction : limits.reaction) {
    reaction = dice.one_in(3) ? Reaction::torque_off : Reaction::ramp_down;
  }
  for (auto& joint : limits.joint) {
    joint.peak_torque_nm = dice.between(1.0, 60.0);
    joint.slew_nm_per_s = dice.between(100.0, 60'000.0);
    joint.damping_nm_s_per_rad = dice.between(0.0, 20.0);
    joint.rated_torque_nm = 1000.0;  // heat has tests of its own
  }
  if (!dice.one_in(4)) return limits;
  JointLimits& joint = limits.joint[static_cast<std::size_t>(dice.below(4))];
  double* const extreme[] = {&joint.peak_torque_nm,
                             &joint.slew_nm_per_s,
                             &joint.soft_edge_rad,
                             &joint.soft_speed_rad_per_s,
                             &joint.speed_max_rad_per_s,
                             &joint.angle_max_rad,
                             &joint.damping_nm_s_per_rad,
                             &joint.trip_torque_nm,
                             &limits.damp_s,
                             &limits.lower_s,
                             &limits.tick_s,
                             &limits.overrun_s,
                             &limits.frame_jump_rad,
                             &limits.frame_stale_s};
  double& one = *extreme[dice.below(static_cast<int>(std::size(extreme)))];
  one = dice.hard(one);
  return limits;
}

/// One thing that goes wrong with the robot, its plug-in, the clock, the policy or the people, for a while.
class Trouble {
 public:
  Trouble(Dice& dice, const Limits& limits)
      : kind_(dice.below(24)),
        joint_(dice.below(std::max(1, limits.joint_count))),
        number_(dice.hard(near(dice, limits))),
        left_(dice.one_in(3) ? 1 : dice.below(50)) {}

  [[nodiscard]] bool over() const { return left_ <= 0; }

  /// Spoils one tick's input; the robot itself stays well.
  void spoil(Dice& dice, Input& in) {
    --left_;
    if (kind_ < 12) return spoil_frame(dice, in.frame);
    spoil_rest(dice, in);
  }

 private:
  double near(Dice& dice, const Limits& limits) const {
    const JointLimits& limit = limits.joint[static_cast<std::size_t>(joint_)];
    const double numbers[] = {limit.angle_max_rad, limit.angle_min_rad,  limit.speed_max_rad_per_s,
                              limit.winding_max_c, limit.trip_torque_nm, limits.rate_range_rad_per_s,
                              limits.overrun_s,    limits.pack_low_v,    limit.peak_torque_nm};
    return numbers[dice.below(static_cast<int>(std::size(numbers)))];
  }

  void spoil_frame(Dice& dice, SensorFrame& frame) const {
    switch (kind_) {
      case 0:
        frame.angle[joint_] = number_;
        break;
      case 1:
        frame.speed[joint_] = number_;
        break;
      case 2:
        frame.torque[joint_] = number_;
        break;
      case 3:
        frame.winding[joint_] = number_;
        break;
      case 4:
        frame.housing[joint_] = number_;
        break;
      case 5:
        frame.rate.y = number_;
        break;
      case 6:
        frame.acceleration.z = number_;
        break;
      case 7:
        frame.pack_voltage_v = number_;
        break;
      case 8:
        frame.pack_current_a = number_;
        break;
      case 9:
        frame.joint_count = static_cast<std::int32_t>(dice.bits()) >> dice.below(32);
        break;
      case 10:
        frame.counter = dice.one_in(2) ? frame.counter - dice.bits() % 40 : dice.bits();
        break;
      default:
        frame.emergency_stop = true;
        break;
    }
  }

  void spoil_rest(Dice& dice, Input& in) const {
    Flags& flags = in.flags;
    switch (kind_) {
      case 12:
        flags.stop = dice.one_in(2);
        break;  // set and cleared between ticks
      case 13:
        flags.halt = dice.one_in(2);
        break;
      case 14:
        flags.baton_lost = true;
        break;
      case 15:
        flags.internal_stop = true;
        break;
      case 16:
        flags.bus_error = dice.one_in(2);
        break;
      case 17:
        flags.frame_new = false;
        break;
      case 18:
        flags.torque_wanted = dice.one_in(2);
        break;
      case 19:
        in.now.value += static_cast<std::int64_t>(dice.bits()) >> dice.below(50);
        break;  // either way
      case 20:
        in.late_s = number_;
        break;
      case 21:
        in.target[joint_] = number_;
        break;
      default:
        in.wanted[joint_] = number_;
        break;
    }
  }

  int kind_;
  int joint_;
  double number_;
  int left_;
};

/// One robot from switching on, with its wishes, until it is switched off.
class Life {
 public:
  Life(Dice& dice, const Limits& limits) : dice_(dice), limits_(limits), gate_(limits), oracle_(limits) {
    robot_.frame.joint_count = std::clamp(limits.joint_count, 0, kMaxJoints);
    robot_.frame.acceleration = {0.0, 0.0, kGravity};
    robot_.frame.pack_voltage_v = 46.0;
    for (auto& x : robot_.frame.winding.values) x = 30.0;
    for (auto& x : robot_.frame.housing.values) x = 30.0;
    if (dice.one_in(10)) restore_heat();
  }

  void live() {
    for (int i = 0; i < kTicksOfALife; ++i) {
      ASSERT_NO_FATAL_FAILURE(tick()) << "tick " << i << " of this life";
    }
  }
  [[nodiscard]] const Oracle::Seen& seen() const { return oracle_.seen(); }

 private:
  void move_robot() {
    for (int j = 0; j < kMaxJoints; ++j) {
      robot_.frame.speed[j] = std::clamp(robot_.frame.speed[j] + dice_.between(-1.0, 1.0), -12.0, 12.0);
      robot_.frame.angle[j] = std::clamp(robot_.frame.angle[j] + 0.001 * robot_.frame.speed[j], -0.9, 1.9);
      robot_.frame.torque[j] = dice_.between(-20.0, 20.0);
      const double wish = dice_.between(-80.0, 80.0);
      robot_.wanted[j] = (dice_.bits() & 1U) != 0 ? wish : (ticks_ % 2 == 0 ? 1e6 : -1e6);  // it oscillates
      robot_.target[j] = robot_.frame.angle[j];
    }
    ++robot_.frame.counter;
    robot_.now.value += 1'000'000 + static_cast<std::int64_t>(dice_.between(-2e5, 2e5));
    robot_.frame.time = robot_.now;
    ++ticks_;
  }

  /// What people and the session do: want torque while the gate is armed, release, set down.
  void people() {
    robot_.flags = Flags{};
    robot_.flags.torque_wanted = gate_.phase() != Phase::off ? !dice_.one_in(400) : dice_.one_in(6);
    robot_.flags.watch_base = false;
    if (gate_.phase() == Phase::off && (trouble_.empty() || dice_.one_in(4))) {
      const bool released = gate_.release();
      ASSERT_EQ(oracle_.judge_release(released), "");
    } else if (dice_.one_in(50)) {  // at any time, it must be refused when it is not due
      ASSERT_EQ(oracle_.judge_release(gate_.release()), "");
    }
    const bool stuck = gate_.phase() == Phase::off && dice_.one_in(60);  // a counter that has run away
    if (stuck || dice_.one_in(500)) {
      gate_.reset_filters();
      oracle_.reset();
    }
    if (dice_.one_in(2000)) restore_heat();
  }

  void restore_heat() {
    PerJoint<Celsius> heat;
    for (auto& x : heat.values) x = dice_.one_in(3) ? dice_.hard(0.5) : dice_.between(0.0, 0.5);
    gate_.restore_thermal_state(heat);
    ASSERT_TRUE(std::isfinite(gate_.thermal_worst()));
  }

  void tick() {
    move_robot();
    ASSERT_NO_FATAL_FAILURE(people());
    if (dice_.one_in(60)) trouble_.emplace_back(dice_, limits_);
    Input in = robot_;
    for (Trouble& one : trouble_) one.spoil(dice_, in);
    std::erase_if(trouble_, [](const Trouble& one) { return one.over(); });
    const bool armed = gate_.phase() == Phase::armed;
    const DriveCommand out = gate_.judge(in.frame, in.wanted, in.target, in.flags, in.now, in.late_s);
    ASSERT_EQ(oracle_.judge(in, armed, out, gate_.phase() == Phase::armed), "")
        << "phase " << name(gate_.phase()) << ", trip " << name(gate_.trip().cause);
    ASSERT_TRUE(std::isfinite(gate_.trip().value) && std::isfinite(gate_.trip().limit));
    ASSERT_TRUE(std::isfinite(gate_.roll_rad()) && std::isfinite(gate_.pitch_rad()));
  }

  Dice& dice_;
  Limits limits_;
  Gate gate_;
  Oracle oracle_;
  Input robot_;
  std::vector<Trouble> trouble_;
  int ticks_{0};
};

TEST(GateCampaign, NothingThatGoesWrongGetsPastTheLimits) {
  Dice dice(20'261'201);
  Oracle::Seen sum;
  for (int life = 0; life < kLives; ++life) {
    Life one(dice, some_robot(dice));
    ASSERT_NO_FATAL_FAILURE(one.live()) << "life " << life;
    sum.powered += one.seen().powered;
    sum.ramps += one.seen().ramps;
    sum.cuts += one.seen().cuts;
    sum.releases += one.seen().releases;
    sum.causes += one.seen().causes;
  }
  // The campaign must have been where it matters.
  EXPECT_GT(sum.powered, kLives * kTicksOfALife / 5);
  EXPECT_GT(sum.ramps, kLives);
  EXPECT_GT(sum.cuts, kLives);
  EXPECT_GT(sum.releases, kLives);
  EXPECT_GT(sum.causes, kLives * 10);
}

}  // namespace
}  // namespace pastern::safety
