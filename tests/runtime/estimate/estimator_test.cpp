// The estimator on walks whose truth is known: a trunk moved by hand over feet that stand exactly.
#include "runtime/estimate/estimator.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstring>
#include <limits>
#include <random>

#include "runtime/estimate/attitude.h"
#include "runtime/estimate/legs.h"
#include "tests/runtime/support/robots.h"

namespace pastern::estimate {
namespace {

using test::shipped_robot;

constexpr double kG = 9.80665;
constexpr double kDt = 0.001;

/// Where the trunk truly is at a time, in the world.
struct Truth {
  Eigen::Vector3d at{0, 0, 0};
  Eigen::Quaterniond attitude{Eigen::Quaterniond::Identity()};
};
using Path = Truth (*)(double time_s);

/// Makes the frames of a walk in which diagonal legs take turns of 0.2 s to stand, nailed to level ground,
/// and carry the weight, while the others swing. Feet are points. Joint angles come from Newton's method on
/// the legs' kinematics.
class NailedWalk {
 public:
  NailedWalk(const v1::Robot& robot, Path path) : legs_(legs_of(robot)), path_(path) {
    frame_.joint_count = robot.joints_size();
    for (int j = 0; j < robot.joints_size(); ++j) {
      frame_.angle[j] = robot.joints(j).stance_rad();
      mass_kg_ += robot.joints(j).link().mass_kg();
    }
    mass_kg_ += robot.trunk().link().mass_kg();
    rest_ = frame_;
    for (std::size_t i = 0; i < 4; ++i) {
      at_[i] = from_[i] = landing(i, 0);
    }
  }

  safety::SensorFrame next() {
    const double time = static_cast<double>(tick_) * kDt;
    const int turn = static_cast<int>(tick_ / kTurnTicks);
    const double share = static_cast<double>(tick_ % kTurnTicks) / kTurnTicks;
    const Truth now = path_(time);
    const safety::SensorFrame before = frame_;
    for (std::size_t i = 0; i < 4; ++i) {
      const bool stands = (i == 0 || i == 3) == (turn % 2 == 0);
      if (stands) {
        from_[i] = at_[i];
      } else {
        swing(i, turn, share);
      }
      solve(i, now.attitude.conjugate() * (at_[i] - now.at));
      carry(i, stands, now);
    }
    for (int j = 0; j < frame_.joint_count; ++j) {
      frame_.speed[j] = tick_ == 0 ? 0 : (frame_.angle[j] - before.angle[j]) / kDt;
    }
    inertial(time);
    frame_.counter = ++tick_;
    return frame_;
  }

  [[nodiscard]] Truth truth() const { return path_(static_cast<double>(tick_ - 1) * kDt); }

 private:
  static constexpr std::uint64_t kTurnTicks = 200;

  Eigen::Vector3d foot(std::size_t leg, const safety::SensorFrame& frame) const {
    return foot_state(legs_.leg[leg], frame, Eigen::Vector3d::UnitZ()).at_m;
  }

  /// On the ground, where the foot would be in the stance half a turn after `time`.
  Eigen::Vector3d landing(std::size_t i, double time) const {
    const Truth then = path_(time + 0.5 * kTurnTicks * kDt);
    Eigen::Vector3d at = then.at + then.attitude * foot(i, rest_);
    at.z() = path_(0).at.z() + foot(i, rest_).z();
    return at;
  }

  void swing(std::size_t i, int turn, double share) {
    const Eigen::Vector3d to = landing(i, (turn + 1) * kTurnTicks * kDt);
    const double way = share * share * share * (10 - 15 * share + 6 * share * share);
    at_[i] = from_[i] + way * (to - from_[i]);
    at_[i].z() += 0.05 * std::pow(std::sin(M_PI * share), 2);
    if (share > 1 - 1.5 / kTurnTicks) {
      at_[i] = to;
    }
  }

  void solve(std::size_t i, const Eigen::Vector3d& wanted) {
    const LegGeometry& leg = legs_.leg[i];
    for (int round = 0; round < 5; ++round) {
      const Eigen::Vector3d error = wanted - foot(i, frame_);
      Eigen::Matrix<double, 3, 4> jacobian = Eigen::Matrix<double, 3, 4>::Zero();
      for (int k = 0; k < leg.joint_count; ++k) {
        safety::SensorFrame moved = frame_;
        moved.angle[leg.joint[static_cast<std::size_t>(k)]] += 1e-6;
        jacobian.col(k) = (foot(i, moved) - foot(i, frame_)) / 1e-6;
      }
      const Eigen::Vector4d step =
          jacobian.transpose() *
          (jacobian * jacobian.transpose() + 1e-9 * Eigen::Matrix3d::Identity()).inverse() * error;
      for (int k = 0; k < leg.joint_count; ++k) {
        frame_.angle[leg.joint[static_cast<std::size_t>(k)]] += step(k);
      }
    }
  }

  void carry(std::size_t i, bool stands, const Truth& now) {
    const LegGeometry& leg = legs_.leg[i];
    const Eigen::Vector3d up = now.attitude.conjugate() * Eigen::Vector3d::UnitZ();
    for (int k = 0; k < leg.joint_count; ++k) {
      safety::SensorFrame moved = frame_;
      moved.angle[leg.joint[static_cast<std::size_t>(k)]] += 1e-6;
      const Eigen::Vector3d way = (foot(i, moved) - foot(i, frame_)) / 1e-6;
      frame_.torque[leg.joint[static_cast<std::size_t>(k)]] =
          stands ? -0.5 * mass_kg_ * kG * way.dot(up) : 0.0;
    }
  }

  void inertial(double time) {
    const double h = 1e-4;
    const Truth before = path_(time - h);
    const Truth now = path_(time);
    const Truth after = path_(time + h);
    const Eigen::Vector3d acceleration = (after.at - 2 * now.at + before.at) / (h * h);
    const Eigen::Vector3d force = now.attitude.conjugate() * (acceleration + Eigen::Vector3d(0, 0, kG));
    const Eigen::AngleAxisd turn(before.attitude.conjugate() * after.attitude);
    const Eigen::Vector3d rate = turn.axis() * turn.angle() / (2 * h);
    frame_.acceleration = {force.x(), force.y(), force.z()};
    frame_.rate = {rate.x(), rate.y(), rate.z()};
  }

  Legs legs_;
  Path path_;
  safety::SensorFrame frame_;
  safety::SensorFrame rest_;
  double mass_kg_{0};
  std::array<Eigen::Vector3d, 4> at_{};    // of each foot, world
  std::array<Eigen::Vector3d, 4> from_{};  // where it stood last
  std::uint64_t tick_{0};
};

v1::Robot point_footed(const std::string& name) {
  v1::Robot robot = shipped_robot(name).robot();
  for (v1::Leg& leg : *robot.mutable_legs()) {
    leg.set_foot_radius_m(0);
  }
  return robot;
}

/// Way after starting from rest, without a jerk, towards `speed`.
double way(double time, double speed) { return speed * time * time * time / (time * time + 0.3); }

Truth straight(double time) { return {{way(time, 0.5), 0, 0.3}, Eigen::Quaterniond::Identity()}; }

/// 0.6 m/s with the sway of a trot and a bend to the left.
Truth swaying(double time) {
  const double turn = 2 * M_PI * 5 * time;
  const double swell = 1 - std::exp(-time * time);
  const double yaw = 0.05 * swell * time;
  return {{way(time, 0.6) + 0.003 * swell * std::sin(turn), 0.015 * time * time,
           0.3 + 0.003 * swell * std::cos(turn)},
          attitude_of({0.03 * swell * std::sin(0.5 * turn), 0.02 * swell * std::sin(turn), yaw})};
}

Truth standing(double) { return {{0, 0, 0.3}, Eigen::Quaterniond::Identity()}; }

TEST(Odometry, SpeedAndWayOfAStraightWalk) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, straight);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  for (int i = 1; i < 3000; ++i) {
    (void)estimator.update(walk.next(), kDt);
  }
  // Setting off at up to 2 m/s^2 tilts the filter a little (kp v / g), and with it what the accelerometer
  // adds.
  EXPECT_NEAR(estimator.body().position.x, walk.truth().at.x(), 0.02 * walk.truth().at.x());
  EXPECT_NEAR(estimator.body().velocity.x, (way(2.999, 0.5) - way(2.998, 0.5)) / kDt, 5e-3);
  EXPECT_NEAR(estimator.body().position.y, 0, 1e-3);
  EXPECT_NEAR(estimator.body().velocity.y, 0, 1e-3);
}

TEST(Odometry, TwoJointLegsDoAsWellStraightAhead) {
  const v1::Robot robot = point_footed("dunlin8");
  NailedWalk walk(robot, straight);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  for (int i = 1; i < 3000; ++i) {
    (void)estimator.update(walk.next(), kDt);
  }
  // Setting off at up to 2 m/s^2 tilts the filter a little (kp v / g), and with it what the accelerometer
  // adds.
  EXPECT_NEAR(estimator.body().position.x, walk.truth().at.x(), 0.02 * walk.truth().at.x());
}

TEST(Odometry, ASwayingAndTurningTrunkIsFollowed) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, swaying);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  double roll_worst = 0;
  for (int i = 1; i < 4000; ++i) {
    (void)estimator.update(walk.next(), kDt);
    const Angles truth = angles_of(walk.truth().attitude);
    roll_worst = std::max(roll_worst, std::abs(truth.roll_rad - estimator.body().roll_rad));
  }
  EXPECT_NEAR(estimator.body().position.x, walk.truth().at.x(), 0.02 * 2.4);
  EXPECT_NEAR(estimator.body().position.y, walk.truth().at.y(), 0.02 * 2.4);
  EXPECT_NEAR(estimator.body().yaw_rad, 0.2, 0.005);
  EXPECT_LT(roll_worst, 0.01);
}

TEST(Odometry, HeightIsThatOverTheFeet) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, standing);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  // Two links of 0.245 and 0.235 m, hip 0.03 m up, hip 0.75 and knee -1.5 rad.
  const double height = 0.48 * std::cos(0.75) - 0.03;
  EXPECT_NEAR(estimator.body().position.z, height, 1e-9) << "at once";
  for (int i = 1; i < 1000; ++i) {
    (void)estimator.update(walk.next(), kDt);
  }
  EXPECT_NEAR(estimator.body().position.z, height, 1e-4);
  EXPECT_NEAR(estimator.body().position.x, 0, 1e-4);
}

TEST(Odometry, WithoutMeasuredTorquesTheLowestFeetStand) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, straight);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  for (int i = 1; i < 2000; ++i) {
    safety::SensorFrame frame = walk.next();
    frame.torque = {};
    (void)estimator.update(frame, kDt);
  }
  // About each change of legs the lowest feet are not those that stand: an eighth of the time, some of the
  // speed.
  EXPECT_NEAR(estimator.body().position.x, walk.truth().at.x(), 0.05 * 1.0);
}

TEST(Odometry, AnExternalPlaceIsFollowedWhereFeetSlip) {
  // The feet say 0.5 m/s; the source says 0.2 m/s, ten times a second, from a place and time of its own.
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, straight);
  Estimator estimator(robot);
  safety::SensorFrame frame = walk.next();
  frame.has_position = true;
  frame.position = {70, -3, 1};
  estimator.begin(frame, true);
  for (int i = 1; i < 4000; ++i) {
    frame = walk.next();
    frame.has_position = true;
    frame.position = {70 + 0.2 * 0.02 * (i / 20), -3, 1};
    (void)estimator.update(frame, kDt);
  }
  EXPECT_NEAR(estimator.body().position.x, 0.8, 0.02);
  EXPECT_NEAR(estimator.body().velocity.x, 0.2, 0.03);
  EXPECT_NEAR(estimator.body().position.y, 0, 0.02);
  EXPECT_LT(estimator.body().position.z, 0.4) << "height stays the legs'";
}

TEST(Estimator, TheImusOwnAttitudeIsTakenWithYawFromTheStart) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, standing);
  Estimator estimator(robot);
  safety::SensorFrame frame = walk.next();
  const auto give = [&frame](const Angles& angles) {
    const Eigen::Quaterniond q = attitude_of(angles);
    frame.has_attitude = true;
    frame.attitude = {q.w(), q.x(), q.y(), q.z()};
  };
  give({0.1, -0.2, 2.0});
  estimator.begin(frame, true);
  EXPECT_NEAR(estimator.body().roll_rad, 0.1, 1e-12);
  EXPECT_NEAR(estimator.body().pitch_rad, -0.2, 1e-12);
  EXPECT_NEAR(estimator.body().yaw_rad, 0, 1e-12);
  give({0.05, 0.1, 2.3});
  frame.counter++;
  (void)estimator.update(frame, kDt);
  EXPECT_NEAR(estimator.body().roll_rad, 0.05, 1e-12);
  EXPECT_NEAR(estimator.body().yaw_rad, 0.3, 1e-12);
  frame.attitude = {0, 0, 0, 0};  // cannot be one: the filter goes on from the last
  frame.counter++;
  (void)estimator.update(frame, kDt);
  EXPECT_NEAR(estimator.body().roll_rad, 0.05, 1e-3);
  EXPECT_TRUE(std::isfinite(estimator.body().yaw_rad));
}

TEST(Estimator, StandingLearnsTheGyrosBias) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, standing);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  for (int i = 0; i < 15000; ++i) {
    safety::SensorFrame frame = walk.next();
    frame.speed = {};  // the swinging legs of the nailed walk stand still
    frame.rate = {0.004, -0.006, 0.008};
    (void)estimator.update(frame, kDt);
  }
  EXPECT_NEAR(estimator.body().rate.x, 0, 2e-4);
  EXPECT_NEAR(estimator.body().rate.y, 0, 2e-4);
  EXPECT_NEAR(estimator.body().rate.z, 0, 2e-4);
}

TEST(Estimator, AFrameThatIsNotFiniteChangesNothing) {
  const v1::Robot robot = point_footed("dunlin12");
  const double nan = std::numeric_limits<double>::quiet_NaN();
  using Damage = void (*)(safety::SensorFrame&, double);
  const std::array<Damage, 5> damages{[](safety::SensorFrame& f, double v) { f.rate.y = v; },
                                      [](safety::SensorFrame& f, double v) { f.acceleration.z = v; },
                                      [](safety::SensorFrame& f, double v) { f.angle[3] = v; },
                                      [](safety::SensorFrame& f, double v) { f.speed[11] = v; },
                                      [](safety::SensorFrame& f, double v) { f.torque[0] = v; }};
  for (const Damage damage : damages) {
    for (const double value : {nan, std::numeric_limits<double>::infinity()}) {
      NailedWalk walk(robot, straight);
      Estimator estimator(robot);
      estimator.begin(walk.next(), true);
      for (int i = 0; i < 50; ++i) {
        (void)estimator.update(walk.next(), kDt);
      }
      const BodyEstimate<> before = estimator.body();
      safety::SensorFrame frame = walk.next();
      damage(frame, value);
      const BodyEstimate<> after = estimator.update(frame, kDt);
      EXPECT_EQ(std::memcmp(&before, &after, sizeof(before)), 0);
      EXPECT_TRUE(std::isfinite(estimator.update(walk.next(), kDt).velocity.x));
    }
  }
}

TEST(Estimator, ABeginOnADamagedFrameIsLevelAndStill) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, standing);
  safety::SensorFrame frame = walk.next();
  frame.acceleration.x = std::numeric_limits<double>::quiet_NaN();
  Estimator estimator(robot);
  estimator.begin(frame, true);
  EXPECT_EQ(estimator.body().position.z, 0);
  EXPECT_TRUE(std::isfinite(estimator.update(walk.next(), kDt).position.z));
}

TEST(Estimator, AColdBeginForgetsEverything) {
  const v1::Robot robot = point_footed("dunlin12");
  std::vector<safety::SensorFrame> frames;
  NailedWalk walk(robot, swaying);
  for (int i = 0; i < 600; ++i) {
    frames.push_back(walk.next());
  }
  Estimator fresh(robot);
  Estimator used(robot);
  used.begin(frames[300], true);
  for (std::size_t i = 301; i < frames.size(); ++i) {
    (void)used.update(frames[i], kDt);
  }
  fresh.begin(frames[0], true);
  used.begin(frames[0], true);
  for (std::size_t i = 1; i < frames.size(); ++i) {
    const BodyEstimate<> a = fresh.update(frames[i], kDt);
    const BodyEstimate<> b = used.update(frames[i], kDt);
    ASSERT_EQ(std::memcmp(&a, &b, sizeof(a)), 0) << i;
  }
}

TEST(Estimator, MissedFramesAreBridgedByTheCounter) {
  const v1::Robot robot = point_footed("dunlin12");
  NailedWalk walk(robot, straight);
  Estimator estimator(robot);
  estimator.begin(walk.next(), true);
  for (int i = 1; i < 3000; ++i) {
    const safety::SensorFrame frame = walk.next();
    if (i % 3 != 0) {
      (void)estimator.update(frame, kDt);
    }
  }
  EXPECT_NEAR(estimator.body().position.x, walk.truth().at.x(), 0.02 * walk.truth().at.x());
}

}  // namespace
}  // namespace pastern::estimate
