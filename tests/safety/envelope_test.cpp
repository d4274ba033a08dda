// The envelope under anything: random bits as frames, torques, targets, times and flags.
#include <bit>
#include <cmath>
#include <cstdint>
#include <random>

#include "tests/safety/fixture.h"

namespace pastern::safety {
namespace {

using test::Loop;

/// Draws numbers that are hard on comparisons: any bits, values near limits, huge, tiny, not finite.
class Noise {
 public:
  explicit Noise(std::uint64_t seed) : random_(seed) {}

  double number() {
    const std::uint64_t bits = random_();
    switch (bits % 6) {
      case 0:
        return std::bit_cast<double>(random_());
      case 1:
        return test::kNan;
      case 2:
        return (bits & 64U) != 0 ? 1e308 : -test::kInf;
      case 3:
        return 0.0;
      default:
        return (static_cast<double>(random_() >> 11) * 0x1p-52 - 1.0) * 100.0;
    }
  }
  bool chance(std::uint64_t one_in) { return random_() % one_in == 0; }
  std::int64_t integer() { return static_cast<std::int64_t>(random_()); }

 private:
  std::mt19937_64 random_;
};

/// Checks one command after another against the envelope.
class Envelope {
 public:
  explicit Envelope(const Limits& limits) : limits_(limits) {}

  void check(const DriveCommand& command) {
    for (int j = 0; j < kMaxJoints; ++j) {
      const double torque = command.torque()[j];
      const auto& joint = limits_.joint[static_cast<std::size_t>(j)];
      const bool on = command.torque_on() && j < limits_.joint_count;
      ASSERT_TRUE(std::isfinite(torque));
      ASSERT_LE(std::fabs(torque), on ? joint.peak_torque_nm : 0.0) << "joint " << j;
      // No tolerance: the gate takes its own rounding off the step.
      if (on) {
        ASSERT_LE(std::fabs(torque - last_[j]), joint.slew_nm_per_s * limits_.tick_s) << "joint " << j;
      }
    }
    last_ = command.torque();
    if (command.torque_on()) ++powered_;
  }
  [[nodiscard]] int powered() const { return powered_; }

 private:
  Limits limits_;
  Torques<> last_;
  int powered_{0};
};

void scramble_frame(Noise& noise, SensorFrame& frame) {
  for (int j = 0; j < kMaxJoints; ++j) {
    frame.angle[j] = noise.number();
    frame.speed[j] = noise.number();
    frame.torque[j] = noise.number();
    frame.winding[j] = noise.number();
    frame.housing[j] = noise.number();
  }
  frame.counter = static_cast<std::uint64_t>(noise.integer());
  frame.joint_count = static_cast<std::int32_t>(noise.chance(2) ? noise.integer() : 3);
  frame.rate = {noise.number(), noise.number(), noise.number()};
  frame.acceleration = {noise.number(), noise.number(), noise.number()};
  frame.attitude = {noise.number(), noise.number(), noise.number(), noise.number()};
  frame.position = {noise.number(), noise.number(), noise.number()};
  frame.pack_voltage_v = noise.number();
  frame.pack_current_a = noise.number();
  frame.has_attitude = noise.chance(2);
  frame.has_position = noise.chance(2);
  frame.emergency_stop = noise.chance(20);
}

void scramble_command(Noise& noise, Torques<>& wanted, JointAngles<>& target) {
  for (int j = 0; j < kMaxJoints; ++j) {
    wanted[j] = noise.number();
    target[j] = noise.number();
  }
}

TEST(EnvelopeUnderNoise, HoldsForRandomFramesTorquesTimesAndFlags) {
  Noise noise(20251);
  const Limits limits = test::some_limits();
  Envelope envelope(limits);
  Gate gate(limits);
  SensorFrame frame;
  Torques<> wanted;
  JointAngles<> target;
  for (int i = 0; i < 100'000; ++i) {
    scramble_frame(noise, frame);
    scramble_command(noise, wanted, target);
    Flags flags;
    flags.stop = noise.chance(30);
    flags.halt = noise.chance(30);
    flags.baton_lost = noise.chance(30);
    flags.internal_stop = noise.chance(30);
    flags.bus_error = noise.chance(30);
    flags.frame_new = noise.chance(2);
    flags.watch_base = noise.chance(2);
    flags.torque_wanted = !noise.chance(3);
    ASSERT_NO_FATAL_FAILURE(
        envelope.check(gate.judge(frame, wanted, target, flags, TimeNs{noise.integer()}, noise.number())));
    if (noise.chance(4)) (void)gate.release();
    if (noise.chance(10)) gate.reset_filters();
    ASSERT_TRUE(std::isfinite(gate.thermal_worst()));
    ASSERT_TRUE(std::isfinite(gate.roll_rad()) && std::isfinite(gate.pitch_rad()));
    ASSERT_TRUE(std::isfinite(gate.trip().value) && std::isfinite(gate.trip().held_s));
  }
}

/// A sound robot whose torques, and now and then one sensor value, go wild; released whenever it may be.
/// Unlike pure noise this spends most ticks with torque on, in every phase.
TEST(EnvelopeUnderNoise, HoldsInEveryPhaseOfARobotThatIsMostlyWell) {
  Noise noise(777);
  Loop loop;
  Envelope envelope(loop.limits);
  int phases[4] = {0, 0, 0, 0};
  for (int i = 0; i < 100'000; ++i) {
    for (int j = 0; j < kMaxJoints; ++j) {  // the robot has three
      const double x = noise.number();
      loop.wanted[j] = std::isfinite(x) || noise.chance(500) ? x : 40.0;
      loop.frame.speed[j] = noise.chance(3) ? 15.0 : -1.0;
      loop.frame.angle[j] += i % 2 == 0 ? 0.001 : -0.001;
    }
    const SensorFrame sound = loop.frame;
    if (noise.chance(700)) loop.frame.rate.x = noise.number();
    if (noise.chance(700)) loop.frame.speed[1] = noise.number();
    loop.flags.stop = noise.chance(1500);
    loop.flags.torque_wanted = loop.gate.phase() != Phase::off;
    ASSERT_NO_FATAL_FAILURE(envelope.check(loop.tick()));
    ++phases[static_cast<int>(loop.gate.phase())];
    const std::uint64_t counter = loop.frame.counter;
    loop.frame = sound;
    loop.frame.counter = counter;
    (void)loop.gate.release();
  }
  // The test must have seen what it is about.
  EXPECT_GT(envelope.powered(), 50'000);
  for (const int ticks : phases) EXPECT_GT(ticks, 50);
}

TEST(EnvelopeUnderNoise, SlewCountsFromZeroWhenTorqueComesOn) {
  Loop loop;
  loop.wanted[0] = 30.0;
  EXPECT_NEAR(loop.tick().torque()[0], 5.0, 1e-9);
  loop.ticks(10);
  EXPECT_EQ(loop.tick().torque()[0], 30.0);
  loop.flags.torque_wanted = false;
  EXPECT_EQ(loop.tick().torque()[0], 0.0);
  loop.flags.torque_wanted = true;
  EXPECT_NEAR(loop.tick().torque()[0], 5.0, 1e-9);
}

TEST(EnvelopeUnderNoise, JointCountsOutsideTheArraysAreBroughtIn) {
  for (const int count : {-5, 0, kMaxJoints, kMaxJoints + 1, 1 << 30}) {
    Limits limits = test::some_limits();
    limits.joint_count = count;
    limits.leg_count = count;
    limits.leg[0].joint_count = count;
    Gate gate(limits);
    SensorFrame frame;
    Torques<> wanted;
    Flags flags;
    flags.torque_wanted = flags.watch_base = true;
    for (auto& x : wanted.values) x = 10.0;
    for (int i = 0; i < 20; ++i) {
      const DriveCommand command = gate.judge(frame, wanted, {}, flags, TimeNs{i * test::kTickNs}, 0.0);
      EXPECT_GE(command.joint_count(), 0);
      EXPECT_LE(command.joint_count(), kMaxJoints);
    }
  }
}

TEST(EnvelopeUnderNoise, WantedTorquesInsideTheEnvelopePassUnchanged) {
  Loop loop;
  for (int i = 0; i < 200; ++i) {
    loop.wanted[0] = 20.0 * std::sin(0.05 * i);
    loop.wanted[1] = -0.5 * loop.wanted[0];
    const DriveCommand command = loop.tick();
    EXPECT_EQ(command.torque()[0], loop.wanted[0]);
    EXPECT_EQ(command.torque()[1], loop.wanted[1]);
    EXPECT_FALSE(loop.gate.clamped());
  }
}

TEST(EnvelopeUnderNoise, FadesReachTheCommand) {
  Loop loop;
  loop.wanted[0] = 4.0;
  loop.frame.angle[0] = 1.95;  // half way into the soft edge
  EXPECT_NEAR(loop.tick().torque()[0], 2.0, 1e-9);
  EXPECT_TRUE(loop.gate.clamped());
  loop.frame.speed[0] = 18.0;  // and half way into the soft speed
  EXPECT_NEAR(loop.tick().torque()[0], 1.0, 1e-9);
}

}  // namespace
}  // namespace pastern::safety
