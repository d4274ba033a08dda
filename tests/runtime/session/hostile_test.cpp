// Whole cycles against a plug-in that lies, people who press everything at any time and policies of any
// numbers: what is written to the drives is judged from the robot file alone.
#include <dlfcn.h>
#include <gtest/gtest.h>

#include <cmath>

#include "tests/runtime/session/hostile_hal.h"
#include "tests/runtime/session/setting.h"
#include "tests/safety/hard_numbers.h"

namespace pastern::session {
namespace {

using safety::test::Dice;

constexpr int kLives = 40;
constexpr int kTicksOfALife = 5000;

class Life {
 public:
  Life(Dice& dice, const files::RobotFile& robot, const files::PolicyFile& policy)
      : dice_(dice),
        robot_(robot.robot()),
        sound_(policy.policy().parameters().begin(), policy.policy().parameters().end()),
        cycle_(robot.robot(), policy.policy(), hostile(robot, dice.bits())) {
    void* const loaded = dlopen(HOSTILE_PATH, RTLD_NOW | RTLD_NOLOAD);
    last_ = reinterpret_cast<HostileLast>(dlsym(loaded, "hostile_last"));
  }

  void live() {
    for (int i = 0; i < kTicksOfALife; ++i) {
      people();
      const bool stop = cycle_.signals().stop || cycle_.signals().internal_stop;
      const bool halt = cycle_.signals().halt;
      const Motion motion = cycle_.report().motion;
      cycle_.tick({});
      ASSERT_NO_FATAL_FAILURE(judge(stop, halt, motion)) << "tick " << i;
    }
  }
  int powered{0};
  int releases{0};
  int walked{0};

 private:
  static std::unique_ptr<hal::Drives> hostile(const files::RobotFile& robot, std::uint64_t seed) {
    std::string error;
    auto drives =
        hal::Drives::open(drives_config(robot, HOSTILE_PATH,
                                        test::puppet_options(robot.robot(), "puppet=" + test::puppet_path()),
                                        seed, Pace::stepped),
                          error);
    EXPECT_TRUE(drives) << error;
    return drives;
  }

  /// Session and operator: motions in and out of order, stops set and cleared, releases, any parameters.
  void people() {
    Signals& signals = cycle_.signals();
    if (dice_.one_in(1500)) signals.stop = true;
    if (dice_.one_in(3000)) signals.halt = true;
    if (dice_.one_in(3000)) signals.internal_stop = true;
    if (dice_.one_in(5)) signals.stop = signals.halt = signals.internal_stop = false;
    if (cycle_.gate().phase() == safety::Phase::off && dice_.one_in(10) && cycle_.gate().release()) {
      ++releases;
      stopping_ = latched_ = false;
      cycle_.set_down();
    }
    if (cycle_.done() && dice_.one_in(20)) {
      const Motion next[] = {Motion::parked, Motion::rise,   Motion::stand, Motion::walk,
                             Motion::walk,   Motion::settle, Motion::lower};
      const Motion motion = next[dice_.below(7)];
      if (motion == Motion::walk) parameters();
      cycle_.begin(motion, dice_.one_in(10) ? dice_.hard(0.1) * 1e-300 : dice_.between(0.01, 0.5));
    }
    if (dice_.one_in(2000)) restore_heat();
  }

  void parameters() {
    ++walked;
    Parameters any = sound_;
    if (dice_.one_in(2)) {
      for (double& x : any) x = dice_.one_in(20) ? dice_.hard(x) : x + dice_.between(-3.0, 3.0);
    }
    cycle_.load(any);
  }

  void restore_heat() {
    v1::CarriedState state;
    const int count = robot_.joints_size() + dice_.below(3);
    for (int j = 0; j < count; ++j) state.add_thermal(dice_.one_in(2) ? dice_.hard(0.5) : 0.1);
    (void)cycle_.restore(state, false);
    ASSERT_TRUE(std::isfinite(cycle_.gate().thermal_worst()));
  }

  void judge(bool stop, bool halt, Motion motion) {
    const HostileTick& tick = *last_();
    const pastern_hal_command& command = tick.command;
    const bool on = command.torque_on != 0;
    ASSERT_EQ(command.struct_size, sizeof command);
    ASSERT_EQ(command.joint_count, static_cast<std::uint32_t>(robot_.joints_size()));
    for (int j = 0; j < PASTERN_HAL_MAX_JOINTS; ++j) {
      const double torque = command.torque_nm[j];
      const bool its = on && j < robot_.joints_size();
      const double peak = its ? robot_.joints(j).guard().peak_torque_nm() : 0.0;
      ASSERT_TRUE(std::fabs(torque) <= peak) << "joint " << j << ": " << torque;
      if (its) {
        ASSERT_LE(std::fabs(torque - before_[j]),
                  robot_.joints(j).guard().slew_nm_per_s() / robot_.cycle_hz())
            << "joint " << j;
      }
      before_[j] = torque;
    }
    powered += on ? 1 : 0;
    ASSERT_FALSE(on && (halt || tick.forbids_torque || motion == Motion::parked || latched_))
        << "halt " << halt << ", frame or bus " << tick.forbids_torque << ", latched " << latched_
        << ", trip " << safety::name(cycle_.gate().trip().cause);
    ticks_stopping_ = stopping_ ? ticks_stopping_ + 1 : 0;
    stopping_ = stopping_ || stop;
    const double stop_s = robot_.guard().damp_s() + robot_.guard().lower_s();
    ASSERT_FALSE(on && stopping_ && ticks_stopping_ > std::lround(stop_s * robot_.cycle_hz()));
    latched_ = latched_ || (!on && (stopping_ || motion != Motion::parked));
  }

  Dice& dice_;
  const v1::Robot robot_;
  Parameters sound_;
  Cycle cycle_;
  HostileLast last_{nullptr};
  double before_[PASTERN_HAL_MAX_JOINTS]{};
  bool stopping_{false};
  bool latched_{false};
  long ticks_stopping_{0};
};

TEST(HostilePlugin, NothingItTellsAndNothingAnybodyDoesMovesATorqueBeyondTheRobotFile) {
  const files::RobotFile robot = test::shipped_robot("dunlin12");
  const files::PolicyFile policy = test::trot_file(robot);
  Dice dice(20'261'202);
  int powered = 0;
  int releases = 0;
  int walked = 0;
  for (int n = 0; n < kLives; ++n) {
    Life life(dice, robot, policy);
    ASSERT_NO_FATAL_FAILURE(life.live()) << "life " << n;
    powered += life.powered;
    releases += life.releases;
    walked += life.walked;
  }
  EXPECT_GT(powered, kLives * kTicksOfALife / 10);
  EXPECT_GT(releases, kLives * 2);
  EXPECT_GT(walked, kLives);
}

}  // namespace
}  // namespace pastern::session
