// Return, recorder, fall and lane rules against sums by hand.
#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "runtime/episode/recorder.h"
#include "tests/runtime/support/robots.h"

namespace pastern::episode {
namespace {

using test::shipped_robot;

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

BodyEstimate<> upright(double x_m = 0, double y_m = 0) {
  BodyEstimate<> body;
  body.position = {x_m, y_m, 0.33};
  return body;
}

TEST(Return, EveryTermByHand) {
  Weights weights;
  weights.speed_cap_m_per_s = 0.8;
  weights.energy_per_j = 0.001;
  weights.drift_per_m_s = 0.4;
  weights.turn_per_rad_s = 0.5;
  weights.fall = 1;
  ReturnSums<double> sums;
  add(sums, TickScore<double>{0.5, 100, -0.25, 0.1}, weights, 0.5);  // slower than the cap
  add(sums, TickScore<double>{3.0, 200, 0.25, -0.3}, weights, 0.5);  // faster: 0.8 counts
  const EpisodeReturn walked = terms(sums, weights, false);
  EXPECT_DOUBLE_EQ(walked.forward, 0.5 * 0.5 + 0.8 * 0.5);
  EXPECT_DOUBLE_EQ(walked.energy, -0.001 * 150);
  EXPECT_DOUBLE_EQ(walked.drift, -0.4 * 0.25);
  EXPECT_DOUBLE_EQ(walked.turn, -0.5 * 0.2);
  EXPECT_EQ(walked.fall, 0);
  EXPECT_DOUBLE_EQ(walked.total(), 0.65 - 0.15 - 0.1 - 0.1);
  EXPECT_DOUBLE_EQ(terms(sums, weights, true).total(), walked.total() - 1);
}

TEST(Return, WalkingBackwardCosts) {
  ReturnSums<double> sums;
  add(sums, TickScore<double>{-0.6, 0, 0, 0}, Weights{}, 1.0);
  EXPECT_DOUBLE_EQ(terms(sums, Weights{}, false).total(), -0.6);
}

TEST(Return, NothingHappenedIsZeroAndNotMinusZero) {
  const EpisodeReturn nothing = terms(ReturnSums<double>{}, Weights{}, false);
  EXPECT_FALSE(std::signbit(nothing.energy) || std::signbit(nothing.drift) || std::signbit(nothing.fall));
}

TEST(Return, FloatScoresAsDouble) {
  ReturnSums<double> wide;
  ReturnSums<float> narrow;
  for (int i = 0; i < 5000; ++i) {
    const double speed = 0.7 + 0.3 * std::sin(0.03 * i);
    const double lateral = 0.1 * std::sin(0.001 * i);
    add(wide, TickScore<double>{speed, 150, lateral, 0.02}, Weights{}, 0.001);
    add(narrow, TickScore<float>{static_cast<float>(speed), 150.0F, static_cast<float>(lateral), 0.02F},
        Weights{}, 0.001);
  }
  // 5 000 additions of like size at 2^-24: relative error below 5 000 x 6e-8.
  EXPECT_NEAR(narrow.forward, wide.forward, 3e-4 * wide.forward);
  EXPECT_NEAR(narrow.energy_j, wide.energy_j, 3e-4 * wide.energy_j);
  EXPECT_NEAR(narrow.drift, wide.drift, 3e-4 * wide.drift);
}

TEST(Return, WeightsComeFromTheRobotFile) {
  const Weights weights = weights_of(shipped_robot("dunlin12").robot());
  EXPECT_EQ(weights.speed_cap_m_per_s, 0.8);
  EXPECT_EQ(weights.energy_per_j, 0.001);
  EXPECT_EQ(weights.drift_per_m_s, 0.4);
  EXPECT_EQ(weights.fall, 1);
}

TEST(JointPower, CountsBothDirectionsOfFlowAndOnlyJointsThatAre) {
  Torques<> torque;
  JointSpeeds<> speed;
  torque[0] = 10, speed[0] = -2;  // braking
  torque[1] = 3, speed[1] = 4;
  torque[2] = 100, speed[2] = 100;
  EXPECT_EQ(joint_power(torque, speed, 2), 32);
}

TEST(CostOfTransport, WorkedExampleAndNotAvailable) {
  // 30 kg, 300 W, 0.8 m/s -> 1.2746453: P/(m g v) with g = 9.80665 m/s^2.
  double cost = -1;
  ASSERT_TRUE(cost_of_transport(300 * 5, 30, 0.8 * 5, cost));
  EXPECT_NEAR(cost, 1.2746453, 5e-8);
  for (const double distance : {0.0, 0.049, -3.0, kNan}) {
    cost = -1;
    EXPECT_FALSE(cost_of_transport(1500, 30, distance, cost)) << distance;
    EXPECT_EQ(cost, -1);
  }
}

TEST(FallRule, TiltIsOfTheBodyAxis) {
  // cos 20 cos 10: 22.268744 degrees, SciPy.
  EXPECT_NEAR(tilt_rad(10 * M_PI / 180, 20 * M_PI / 180) * 180 / M_PI, 22.268744, 1e-6);
  EXPECT_NEAR(tilt_rad(M_PI, 0), M_PI, 1e-12);
}

TEST(FallRule, AtTheLimitsJustInsideAndNotANumber) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  const FallRule rule = fall_rule_of(robot);
  EXPECT_NEAR(rule.tilt_rad, 34 * M_PI / 180, 1e-4);
  // Two links of 0.245 and 0.235 m, hip at +0.03 m, foot of 0.02 m, hip 0.75 and knee -1.5 rad: half of the
  // height.
  const double height = (0.245 * std::cos(0.75) + 0.235 * std::cos(-0.75)) + 0.02 - 0.03;
  EXPECT_NEAR(rule.least_height_m, 0.5 * height, 1e-9);

  BodyEstimate<> body = upright();
  EXPECT_FALSE(fell(rule, body));
  body.roll_rad = rule.tilt_rad - 1e-9;
  EXPECT_FALSE(fell(rule, body));
  body.roll_rad = rule.tilt_rad + 1e-9;
  EXPECT_TRUE(fell(rule, body));
  body.roll_rad = kNan;
  EXPECT_TRUE(fell(rule, body));
  body = upright();
  body.position.z = rule.least_height_m;
  EXPECT_FALSE(fell(rule, body));
  body.position.z = rule.least_height_m - 1e-9;
  EXPECT_TRUE(fell(rule, body));
  body.position.z = kNan;
  EXPECT_TRUE(fell(rule, body));
}

TEST(LaneRule, EitherSideAndNotANumber) {
  const FallRule rule = fall_rule_of(shipped_robot("dunlin12").robot());
  EXPECT_FALSE(left_lane(rule, upright(1, rule.lane_half_width_m)));
  EXPECT_TRUE(left_lane(rule, upright(1, rule.lane_half_width_m + 1e-9)));
  EXPECT_TRUE(left_lane(rule, upright(1, -rule.lane_half_width_m - 1e-9)));
  EXPECT_TRUE(left_lane(rule, upright(1, kNan)));
  EXPECT_EQ(outcome_of(rule, upright()), Outcome::completed);
  EXPECT_EQ(outcome_of(rule, upright(1, 9)), Outcome::left_lane);
  BodyEstimate<> both = upright(1, 9);
  both.pitch_rad = 1.2;
  EXPECT_EQ(outcome_of(rule, both), Outcome::fell);
}

TickRecord record_at(int tick) {
  TickRecord record;
  record.body = upright(0.0005 * (tick + 1), 0.1);  // 0.5 m/s
  record.body.velocity.x = 0.5;
  record.body.roll_rad = (tick % 2) ? 0.03 : -0.03;
  record.body.pitch_rad = tick == 1234 ? -0.2 : 0.0;
  record.power_w = 80;
  record.pack_power_w = 150;
  record.pack_voltage_v = 44 - 0.0001 * tick;
  record.winding_max_c = 30 + 0.001 * tick;
  record.clamped = tick % 4 == 0;
  record.targets_clipped = tick % 20 == 0 ? 2 : 0;
  return record;
}

TEST(Recorder, FiguresOfAWalkByHand) {
  const v1::Robot robot = shipped_robot("dunlin12").robot();
  EpisodeRecorder recorder(robot);
  for (int tick = 0; tick < 5000; ++tick) {
    recorder.add(record_at(tick), {}, 0.001);
  }
  const v1::EpisodeSummary summary = recorder.summary();
  EXPECT_NEAR(summary.duration_s(), 5, 1e-9);
  EXPECT_NEAR(summary.distance_m(), 2.5, 1e-12);
  EXPECT_NEAR(summary.mean_speed_m_per_s(), 0.5, 1e-9);
  EXPECT_NEAR(summary.energy_j(), 400, 1e-6);
  EXPECT_NEAR(summary.pack_energy_j(), 750, 1e-6);
  EXPECT_TRUE(summary.moved_forward());
  double mass = robot.trunk().link().mass_kg();
  for (const v1::Joint& joint : robot.joints()) {
    mass += joint.link().mass_kg();
  }
  EXPECT_NEAR(summary.cost_of_transport(), 80 / (mass * 9.80665 * 0.5), 1e-9);
  EXPECT_NEAR(summary.roll_rms_rad(), 0.03, 1e-12);
  EXPECT_NEAR(summary.pitch_rms_rad(), 0.2 / std::sqrt(5000), 1e-12);
  EXPECT_EQ(summary.roll_max_rad(), 0.03);
  EXPECT_EQ(summary.pitch_max_rad(), 0.2);
  EXPECT_NEAR(summary.winding_max_c(), 34.999, 1e-9);
  EXPECT_NEAR(summary.pack_min_v(), 43.5001, 1e-9);
  EXPECT_DOUBLE_EQ(summary.clamped_share(), 0.25);
  EXPECT_EQ(summary.targets_clipped(), 500u);
  const EpisodeReturn terms = recorder.terms(false);
  EXPECT_NEAR(terms.total(), 2.5 - 0.4 - 0.4 * 0.1 * 5, 1e-9);
}

TEST(Recorder, TraceIsAtFiftyHertzWhateverTheCycle) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  for (const double dt_s : {0.001, 0.002, 1.0 / 300, 0.0005}) {
    EpisodeRecorder recorder(robot);
    const int ticks = static_cast<int>(std::lround(5 / dt_s));
    for (int tick = 0; tick < ticks; ++tick) {
      recorder.add(record_at(tick), {}, dt_s);
    }
    const v1::Trace trace = recorder.trace();
    ASSERT_EQ(trace.time_s_size(), 250) << dt_s;
    ASSERT_EQ(trace.x_m_size(), 250);
    ASSERT_EQ(trace.speed_m_per_s_size(), 250);
    ASSERT_EQ(trace.height_m_size(), 250);
    ASSERT_EQ(trace.yaw_rad_size(), 250);
    for (int i = 0; i < 250; ++i) {
      EXPECT_NEAR(trace.time_s(i), 0.02 * i, 0.51 * dt_s + 1e-6);
    }
  }
}

TEST(Recorder, TraceHoldsTheJointsAnglesRowByRow) {
  const v1::Robot robot = shipped_robot("dunlin8").robot();
  EpisodeRecorder recorder(robot, 1.0);
  JointAngles<> angle;
  for (int tick = 0; tick < 2000; ++tick) {  // longer than foreseen
    for (int j = 0; j < 8; ++j) angle[j] = tick + 0.125 * j;
    recorder.add(record_at(tick), angle, 0.001);
  }
  const v1::Trace trace = recorder.trace();
  ASSERT_EQ(trace.joint_angle_rad_size(), 8 * trace.time_s_size());
  for (int i = 0; i < trace.time_s_size(); ++i) {
    EXPECT_EQ(trace.joint_angle_rad(8 * i + 7) - trace.joint_angle_rad(8 * i), 0.875F);
    EXPECT_NEAR(trace.joint_angle_rad(8 * i), 1000 * trace.time_s(i), 1);
  }
}

TEST(Recorder, AWalkLongerThanForeseenKeepsItsFiguresAndLosesOnlyTrace) {
  EpisodeRecorder recorder(shipped_robot("dunlin8").robot(), 1.0);
  for (int tick = 0; tick < 3000; ++tick) {
    recorder.add(record_at(tick), {}, 0.001);
  }
  EXPECT_NEAR(recorder.summary().duration_s(), 3, 1e-9);
  EXPECT_GE(recorder.trace().time_s_size(), 50);
  EXPECT_LE(recorder.trace().time_s_size(), 60);
}

TEST(Recorder, BeginForgetsAndNothingAddedIsNothingSaid) {
  EpisodeRecorder recorder(shipped_robot("dunlin8").robot());
  for (int tick = 0; tick < 100; ++tick) {
    recorder.add(record_at(tick), {}, 0.001);
  }
  recorder.begin();
  EXPECT_EQ(recorder.trace().time_s_size(), 0);
  const v1::EpisodeSummary summary = recorder.summary();
  EXPECT_EQ(summary.duration_s(), 0);
  EXPECT_FALSE(summary.moved_forward());
  EXPECT_EQ(summary.cost_of_transport(), 0);
  EXPECT_EQ(summary.winding_max_c(), 0);
  EXPECT_EQ(recorder.terms(true).total(), -1);
}

TEST(Recorder, ARobotThatDidNotMoveHasNoCostOfTransport) {
  EpisodeRecorder recorder(shipped_robot("dunlin8").robot());
  TickRecord record;
  record.body = upright();
  record.power_w = 50;
  recorder.add(record, {}, 0.001);
  EXPECT_FALSE(recorder.summary().moved_forward());
  EXPECT_EQ(recorder.summary().cost_of_transport(), 0);
}

}  // namespace
}  // namespace pastern::episode
