// The estimator against the simulated robot, whose truth is known: trots of several speeds, roads and loads.
#include <gtest/gtest.h>

#include <cmath>
#include <memory>
#include <string>

#include "hal_stub/robot/simulated_robot.h"
#include "runtime/control/pd.h"
#include "runtime/estimate/estimator.h"
#include "runtime/policy/policy.h"
#include "tests/runtime/support/robots.h"

namespace pastern::estimate {
namespace {

using stub::SimulatedRobot;
using test::shipped_robot;
using test::trot_policy;

struct Walk {
  double true_way_m{0};
  double way_m{0};
  double true_side_m{0};
  double side_m{0};
  double true_yaw_rad{0};
  double yaw_rad{0};
  double roll_error_rad{0};       // rms
  double pitch_error_rad{0};      // rms
  double speed_error_m_per_s{0};  // rms, of the forward speed
  double height_error_m{0};       // rms
  double speed_bias_m_per_s{0};   // mean of the estimate's less the true forward speed
  bool fell{false};
};

Walk walked(const v1::Robot& robot_file, const v1::Policy& policy_file, const stub::Site& site,
            const std::shared_ptr<const stub::Model>& model, std::uint64_t draw, double duration_s) {
  SimulatedRobot robot(model, site, 7);
  robot.place_standing(draw);
  Estimator estimator(robot_file);
  const auto policy = policy::Policy::make(policy_file, robot_file);
  const auto gains = control::gains_of(robot_file);
  JointTarget<> target;
  for (int j = 0; j < robot_file.joints_size(); ++j) {
    target.angle[j] = robot_file.joints(j).stance_rad();
  }
  safety::SensorFrame frame;
  (void)robot.read(frame);
  estimator.begin(frame, true);
  Walk walk;
  const double dt = 1 / robot_file.cycle_hz();
  const int settle = 600;
  const int ticks = settle + static_cast<int>(duration_s / dt);
  stub::Truth start = robot.truth();
  for (int tick = 0; tick < ticks && !walk.fell; ++tick) {
    if (robot.read(frame)) {
      (void)estimator.update(frame, dt);
    }
    if (tick == settle) {
      estimator.begin(frame, false);
      start = robot.truth();
    }
    if (tick >= settle && (tick - settle) % 20 == 0) {
      target = policy->step(estimator.body(), frame.angle, frame.speed, 0.02);
    }
    robot.command(control::pd_torques(gains, target, frame.angle, frame.speed), true);
    robot.step();
    const stub::Truth truth = robot.truth();
    walk.fell = truth.fallen;
    if (tick >= settle) {
      const BodyEstimate<>& body = estimator.body();
      const double speed = truth.velocity_m_per_s[0] * std::cos(start.yaw_rad) +
                           truth.velocity_m_per_s[1] * std::sin(start.yaw_rad);
      const double share = dt / duration_s;
      walk.roll_error_rad += std::pow(body.roll_rad - truth.roll_rad, 2) * share;
      walk.pitch_error_rad += std::pow(body.pitch_rad - truth.pitch_rad, 2) * share;
      walk.speed_error_m_per_s += std::pow(body.velocity.x - speed, 2) * share;
      walk.height_error_m += std::pow(body.position.z - truth.height_m, 2) * share;
      walk.speed_bias_m_per_s += (body.velocity.x - speed) * share;
    }
  }
  const stub::Truth end = robot.truth();
  const double dx = end.position_m[0] - start.position_m[0];
  const double dy = end.position_m[1] - start.position_m[1];
  walk.true_way_m = dx * std::cos(start.yaw_rad) + dy * std::sin(start.yaw_rad);
  walk.true_side_m = dy * std::cos(start.yaw_rad) - dx * std::sin(start.yaw_rad);
  walk.true_yaw_rad = end.yaw_rad - start.yaw_rad;
  walk.way_m = estimator.body().position.x;
  walk.side_m = estimator.body().position.y;
  walk.yaw_rad = estimator.body().yaw_rad;
  for (double* square :
       {&walk.roll_error_rad, &walk.pitch_error_rad, &walk.speed_error_m_per_s, &walk.height_error_m}) {
    *square = std::sqrt(*square);
  }
  return walk;
}

struct Bench {
  explicit Bench(const std::string& name) : robot(shipped_robot(name).robot()) {
    std::string error;
    model = stub::Model::make(robot, error);
    EXPECT_NE(model, nullptr) << error;
    site = stub::nominal_site(*model);
  }
  [[nodiscard]] Walk trot(double swing_rad, std::uint64_t draw) const {
    return walked(robot, trot_policy(robot, swing_rad, 0.03), site, model, draw, 4);
  }

  v1::Robot robot;
  std::shared_ptr<const stub::Model> model;
  stub::Site site;
};

TEST(SimulatedWalk, ForwardSpeedOfATrotIsWithoutBiasOnAGoodFloor) {
  for (const char* name : {"dunlin12", "dunlin8"}) {
    const Bench bench(name);
    double fastest = 0;
    for (const double swing : {0.1, 0.2, 0.3}) {
      const Walk walk = bench.trot(swing, 3);
      ASSERT_FALSE(walk.fell) << name << " " << swing;
      // A few percent of 0.1 to 0.7 m/s; what a foot creeps or rolls before it grips cannot be seen from
      // inside.
      EXPECT_NEAR(walk.speed_bias_m_per_s, 0, 0.015 + 0.02 * walk.true_way_m / 4) << name << " " << swing;
      EXPECT_LT(walk.speed_error_m_per_s, 0.06);
      EXPECT_LT(walk.height_error_m, 0.01);
      EXPECT_LT(walk.roll_error_rad, 0.01);
      EXPECT_LT(walk.pitch_error_rad, 0.02);
      EXPECT_NEAR(walk.yaw_rad, walk.true_yaw_rad, 0.03);
      EXPECT_NEAR(walk.side_m, walk.true_side_m, 0.07);
      fastest = std::max(fastest, walk.true_way_m);
    }
    EXPECT_GT(fastest, 2) << "the comparison must not be between robots that stand still";
  }
}

TEST(SimulatedWalk, ASlipperyFloorIsSeenInPart) {
  Bench bench("dunlin12");
  bench.site.friction = 0.4;
  for (const double swing : {0.2, 0.3}) {
    const Walk walk = bench.trot(swing, 3);
    ASSERT_FALSE(walk.fell);
    EXPECT_NEAR(walk.speed_bias_m_per_s, 0, 0.05);
  }
}

TEST(SimulatedWalk, ALoadADelayAndASlopeDoNotMislead) {
  Bench bench("dunlin12");
  bench.site.load_kg = 1;
  bench.site.load_at_m = {0, 0.02, 0.1};
  bench.site.command_delay_s = 0.01;
  bench.site.slope_rad = 0.02;
  const Walk walk = bench.trot(0.2, 5);
  ASSERT_FALSE(walk.fell);
  EXPECT_NEAR(walk.speed_bias_m_per_s, 0, 0.03);
}

TEST(SimulatedWalk, AnImuMountedCrookedlyDoesNotRunAway) {
  Bench bench("dunlin12");
  bench.site.imu_tilt_rad = {0.02, 0.035, 0};
  const Walk walk = bench.trot(0.2, 4);
  ASSERT_FALSE(walk.fell);
  EXPECT_NEAR(walk.speed_bias_m_per_s, 0, 0.05);
}

TEST(SimulatedWalk, AnExternalPlaceTakesTheBiasOfASlipperyFloorAway) {
  Bench bench("dunlin12");
  bench.site.friction = 0.4;
  bench.site.position_source = true;
  const Walk walk = bench.trot(0.2, 3);
  ASSERT_FALSE(walk.fell);
  EXPECT_NEAR(walk.way_m, walk.true_way_m, 0.03);
  EXPECT_NEAR(walk.speed_bias_m_per_s, 0, 0.01);
}

}  // namespace
}  // namespace pastern::estimate
