// Attitude and odometry put together.
#include "runtime/estimate/estimator.h"

#include <Eigen/Core>
#include <Eigen/Geometry>
#include <algorithm>
#include <cmath>

#include "runtime/estimate/attitude.h"
#include "runtime/estimate/odometry.h"

namespace pastern::estimate {

namespace {

constexpr double kGravity = 9.80665;            // m/s^2
constexpr std::uint64_t kMostTicksMissed = 20;  // the stale watch trips before

double weight_n(const v1::Robot& robot) {
  double mass = robot.trunk().link().mass_kg();
  for (const v1::Joint& joint : robot.joints()) {
    mass += joint.link().mass_kg();
  }
  return mass * kGravity;
}

template <class Unit, class Frame>
Eigen::Vector3d vector(const safety::Vector3<Unit, Frame>& v) noexcept {
  return {v.x, v.y, v.z};
}

/// Everything that is used; the gate judges ranges.
bool finite(const safety::SensorFrame& frame, int joint_count) noexcept {
  double sum = vector(frame.rate).sum() + vector(frame.acceleration).sum();
  for (int j = 0; j < joint_count; ++j) {
    sum += frame.angle[j] + frame.speed[j] + frame.torque[j];
  }
  if (frame.has_position) {
    sum += vector(frame.position).sum();
  }
  return std::isfinite(sum);
}

/// A trunk that stands still: joint speeds and rate small, the force on it that of gravity, for a while.
class Rest {
 public:
  void begin() noexcept { still_s_ = 0; }

  [[nodiscard]] bool update(const safety::SensorFrame& frame, int joint_count, double dt_s) noexcept {
    double square = 0;
    for (int j = 0; j < joint_count; ++j) {
      square += frame.speed[j] * frame.speed[j];
    }
    const double speed = std::sqrt(square / std::max(joint_count, 1));
    const double force = vector(frame.acceleration).norm() - kGravity;
    const bool still =
        speed < kStillSpeed && vector(frame.rate).norm() < kStillRate && std::abs(force) < kStillForce;
    still_s_ = still ? still_s_ + dt_s : 0.0;
    return still_s_ > kStillFor;
  }

 private:
  static constexpr double kStillSpeed = 0.12;  // rad/s, root mean square
  static constexpr double kStillRate = 0.08;   // rad/s
  static constexpr double kStillForce = 1.0;   // m/s^2 off gravity
  static constexpr double kStillFor = 0.1;     // s
  double still_s_{0};
};

}  // namespace

struct Estimator::State {
  explicit State(const v1::Robot& robot)
      : joint_count(robot.joints_size()), odometry(legs_of(robot), weight_n(robot)) {}

  /// Takes the IMU's own attitude if it gives one that can be one.
  bool adopt(const safety::SensorFrame& frame) noexcept {
    const Eigen::Quaterniond given(frame.attitude.w, frame.attitude.x, frame.attitude.y, frame.attitude.z);
    const double norm = given.norm();
    if (!frame.has_attitude || !(std::abs(norm - 1.0) < 0.1)) {
      return false;
    }
    own_attitude = given.normalized();
    attitude.adopt(Eigen::AngleAxisd(-own_yaw_at_start, Eigen::Vector3d::UnitZ()) * own_attitude);
    return true;
  }

  void publish(const safety::SensorFrame& frame) noexcept {
    const Angles angles = angles_of(attitude.attitude());
    const Eigen::Vector3d rate = vector(frame.rate) - attitude.bias_rad_s();
    const Eigen::Vector3d& velocity = odometry.velocity_m_s();
    const Eigen::Vector3d& position = odometry.position_m();
    body.roll_rad = angles.roll_rad;
    body.pitch_rad = angles.pitch_rad;
    body.yaw_rad = angles.yaw_rad;
    body.rate = {rate.x(), rate.y(), rate.z()};
    body.velocity = {velocity.x(), velocity.y(), velocity.z()};
    body.position = {position.x(), position.y(), position.z()};
  }

  int joint_count;
  AttitudeFilter attitude;
  Odometry odometry;
  Rest rest;
  Eigen::Quaterniond own_attitude{Eigen::Quaterniond::Identity()};
  double own_yaw_at_start{0};
  std::uint64_t counter{0};
  BodyEstimate<> body;
};

Estimator::Estimator(const v1::Robot& robot) : state_(std::make_unique<State>(robot)) {}
Estimator::~Estimator() = default;

void Estimator::begin(const safety::SensorFrame& frame, bool cold) noexcept {
  State& state = *state_;
  state.rest.begin();
  state.counter = frame.counter;
  if (!finite(frame, state.joint_count)) {
    state.body = {};
    return;
  }
  if (cold) {
    state.attitude.begin(vector(frame.acceleration));
  }
  state.own_yaw_at_start = 0;
  if (state.adopt(frame)) {
    state.own_yaw_at_start = angles_of(state.own_attitude).yaw_rad;
  }
  state.attitude.zero_yaw();
  state.odometry.begin(frame, state.attitude.attitude());
  state.publish(frame);
}

const BodyEstimate<>& Estimator::update(const safety::SensorFrame& frame, double dt_s) noexcept {
  State& state = *state_;
  // One frame that is not finite must not stay in the filters for ever; the gate trips on it.
  if (!finite(frame, state.joint_count)) {
    return state.body;
  }
  const std::uint64_t ticks = frame.counter > state.counter ? frame.counter - state.counter : 1;
  const double passed_s = dt_s * static_cast<double>(std::min(ticks, kMostTicksMissed));
  state.counter = frame.counter;
  const bool at_rest = state.rest.update(frame, state.joint_count, passed_s);
  if (!state.adopt(frame)) {
    state.attitude.update(vector(frame.rate), vector(frame.acceleration), passed_s, at_rest);
  }
  state.odometry.update(frame, state.attitude.attitude(), vector(frame.rate) - state.attitude.bias_rad_s(),
                        passed_s);
  state.publish(frame);
  return state.body;
}

const BodyEstimate<>& Estimator::body() const noexcept { return state_->body; }

}  // namespace pastern::estimate
