// The stages of a tick over lanes: each lane does what the robot's own double does, for policy, PD, clamps,
// return and one step of the simulated robot. Tolerances: double lanes differ by rounding alone (another
// order of operations by fused multiply-add, tanh and acos within 3 units of the last place); float by its
// 24 bits over sums of dozens of terms.
#include <gtest/gtest.h>

#include <cmath>
#include <random>

#include "runtime/control/pd.h"
#include "runtime/episode/recorder.h"
#include "runtime/policy/policy_parts.h"
#include "safety/clamps.h"
#include "tests/runtime/support/robots.h"
#include "tools/packed/functions.h"

namespace pastern::packed::PASTERN_LANES_SET {
namespace {

template <class L>
class StagesTest : public testing::Test {
 protected:
  using Number = typename L::Constant;
  static constexpr double kTolerance = sizeof(Number) == 4 ? 3e-5 : 3e-14;

  std::mt19937_64 engine{11};

  // Another number in each lane, and the same as doubles.
  L drawn(double low, double high) {
    std::uniform_real_distribution<double> even(low, high);
    std::array<Number, L::kLanes> lanes{};
    for (Number& lane : lanes) lane = static_cast<Number>(even(engine));
    return L::of(lanes);
  }
  static void expect_near(double lane, double plain, double scale, const char* what) {
    EXPECT_NEAR(lane, plain, kTolerance * scale) << what;
  }
};

using Kinds = testing::Types<Floats, Doubles, Lanes<float, 16>, Lanes<double, 4>>;
TYPED_TEST_SUITE(StagesTest, Kinds);

v1::Policy layered_policy(const v1::Robot& robot) {
  v1::Policy policy = pastern::test::trot_policy(robot, 0.3, 0.03);
  policy.clear_channels();
  pastern::test::add_channel(policy, v1::Channel::ROLL);
  pastern::test::add_channel(policy, v1::Channel::PITCH_RATE, "", 0.2);
  pastern::test::add_channel(policy, v1::Channel::PHASE_SIN);
  pastern::test::add_channel(policy, v1::Channel::JOINT_OFFSET, robot.joints(4).name());
  v1::Layer& layer = *policy.mutable_layers(0);
  layer.set_inputs(4);
  layer.set_activation(v1::Layer::TANH);
  layer.set_has_bias(true);
  policy.clear_parameters();
  for (int i = 0; i < 5 * pastern::test::output_count(robot); ++i) policy.add_parameters(0);
  return policy;
}

template <class S>
struct Phase {
  S sine;
  S cosine;
};

TYPED_TEST(StagesTest, APolicyStepAndItsTorquesAreThoseOfEachLanesRobot) {
  using L = TypeParam;
  const v1::Robot robot = pastern::test::shipped_robot("dunlin12").robot();
  const v1::Policy file = layered_policy(robot);
  const auto shape = policy::shape_of<L>(file, robot);
  const auto plain = policy::shape_of<double>(file, robot);
  auto scratch = policy::scratch_of(shape);
  auto plain_scratch = policy::scratch_of(plain);
  std::vector<L> parameters;
  for (std::size_t i = 0; i < shape.parameter_count; ++i) parameters.push_back(this->drawn(-0.6, 0.6));
  BodyEstimate<L> body;
  body.roll_rad = this->drawn(-0.3, 0.3);
  body.rate.y = this->drawn(-2, 2);
  JointAngles<L> angle;
  JointSpeeds<L> speed;
  for (int j = 0; j < 12; ++j) {
    angle[j] = this->drawn(-1.5, 1.5);
    speed[j] = this->drawn(-10, 10);
  }
  const L turn = this->drawn(0, 6.2);
  const JointTarget<L> target =
      policy::evaluate(shape, parameters.data(), scratch, body, angle, speed, Phase<L>{sin(turn), cos(turn)});
  control::Gains<L> gains;
  control::Gains<> plain_gains = control::gains_of(robot);
  gains.joint_count = 12;
  for (std::size_t j = 0; j < 12; ++j) {
    gains.stiffness[j] = L(plain_gains.stiffness[j]);
    gains.damping[j] = L(plain_gains.damping[j]);
  }
  const Torques<L> torque = control::pd_torques(gains, target, angle, speed);
  const L power = episode::joint_power(torque, speed, 12);
  int clipped = 0;
  for (int lane = 0; lane < L::kLanes; ++lane) {
    BodyEstimate<> one;
    one.roll_rad = body.roll_rad[lane];
    one.rate.y = body.rate.y[lane];
    JointAngles<> one_angle;
    JointSpeeds<> one_speed;
    for (int j = 0; j < 12; ++j) {
      one_angle[j] = angle[j][lane];
      one_speed[j] = speed[j][lane];
    }
    std::vector<double> one_parameters;
    for (const L& p : parameters) one_parameters.push_back(p[lane]);
    const policy::GaitPhase phase{std::sin(double{turn[lane]}), std::cos(double{turn[lane]})};
    const JointTarget<> one_target =
        policy::evaluate(plain, one_parameters.data(), plain_scratch, one, one_angle, one_speed, phase);
    const Torques<> one_torque = control::pd_torques(plain_gains, one_target, one_angle, one_speed);
    for (int j = 0; j < 12; ++j) {
      this->expect_near(target.angle[j][lane], one_target.angle[j], 3, "target");
      this->expect_near(torque[j][lane], one_torque[j], 400, "torque");
    }
    this->expect_near(power[lane], episode::joint_power(one_torque, one_speed, 12), 30000, "power");
    clipped += one_target.clipped;
  }
  EXPECT_EQ(target.clipped, clipped);
}

TYPED_TEST(StagesTest, WhatIsNotANumberStaysInItsLaneOfAPolicyStep) {
  using L = TypeParam;
  const v1::Robot robot = pastern::test::shipped_robot("dunlin12").robot();
  const auto shape = policy::shape_of<L>(layered_policy(robot), robot);
  auto scratch = policy::scratch_of(shape);
  std::vector<L> parameters(shape.parameter_count, L(0.1));
  BodyEstimate<L> body{};
  body.roll_rad.put(1, std::numeric_limits<typename L::Constant>::quiet_NaN());
  const auto target = policy::evaluate(shape, parameters.data(), scratch, body, JointAngles<L>{},
                                       JointSpeeds<L>{}, Phase<L>{L(0), L(1)});
  for (int j = 0; j < 12; ++j) {
    EXPECT_TRUE(std::isnan(target.angle[j][1])) << j;
    EXPECT_FALSE(std::isnan(target.angle[j][0])) << j;
  }
}

TYPED_TEST(StagesTest, ClampsAreThoseOfEachLanesJointAndLetNothingPass) {
  using L = TypeParam;
  using T = typename L::Constant;
  const T ugly[] = {T(0), T(1), T(-1), T(5), T(-5), T(30), T(-30), T(HUGE_VAL), T(-HUGE_VAL), T(NAN)};
  for (const T wanted : ugly) {
    for (const T state : ugly) {
      L torque(T(2));
      L at(T(0.1));
      torque.put(1, wanted);
      at.put(1, state);
      const auto peak = safety::peak_clamp(torque, L(10));
      const auto slew = safety::slew_clamp(torque, L(T(1)), L(T(0.5)));
      const auto edge = safety::edge_fade(torque, at, L(-2), L(2), L(T(0.25)));
      const auto fast = safety::speed_fade(torque, at, L(15), L(20));
      const double t = wanted;
      const double a = state;
      const double plain[] = {safety::peak_clamp(t, 10.0), safety::slew_clamp(t, 1.0, 0.5),
                              safety::edge_fade(t, a, -2.0, 2.0, 0.25), safety::speed_fade(t, a, 15.0, 20.0)};
      const T lane[] = {peak[1], slew[1], edge[1], fast[1]};
      for (int i = 0; i < 4; ++i) {
        EXPECT_EQ(std::isnan(lane[i]), std::isnan(plain[i])) << i << ' ' << wanted << ' ' << state;
        if (!std::isnan(plain[i])) {
          EXPECT_EQ(double{lane[i]}, plain[i]) << i << ' ' << wanted << ' ' << state;
        }
      }
      EXPECT_LE(std::abs(peak[1]), T(10));
      EXPECT_EQ(peak[0], T(2));
    }
  }
}

TYPED_TEST(StagesTest, TheReturnIsThatOfEachLanesWalk) {
  using L = TypeParam;
  episode::ReturnSums<L> sums{};
  std::vector<episode::ReturnSums<double>> plain(L::kLanes);
  for (int tick = 0; tick < 500; ++tick) {
    const episode::TickScore<L> score{this->drawn(-1, 2), this->drawn(0, 300), this->drawn(-1, 1),
                                      this->drawn(-1, 1)};
    episode::add(sums, score, episode::Weights{}, 0.001);
    for (int lane = 0; lane < L::kLanes; ++lane) {
      episode::add(plain[static_cast<std::size_t>(lane)],
                   episode::TickScore<double>{score.speed_m_per_s[lane], score.power_w[lane],
                                              score.lateral_m[lane], score.yaw_rad[lane]},
                   episode::Weights{}, 0.001);
    }
  }
  for (int lane = 0; lane < L::kLanes; ++lane) {
    const auto& one = plain[static_cast<std::size_t>(lane)];
    this->expect_near(sums.forward[lane], one.forward, 1, "forward");
    this->expect_near(sums.energy_j[lane], one.energy_j, 150, "energy");
    this->expect_near(sums.drift[lane], one.drift, 1, "drift");
    this->expect_near(sums.turn[lane], one.turn, 1, "turn");
  }
}

}  // namespace
}  // namespace pastern::packed::PASTERN_LANES_SET
