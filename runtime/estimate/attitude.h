// Attitude from gyro and accelerometer: explicit complementary filter with gyro-bias estimate, Mahony, Hamel
// and Pflimlin, "Nonlinear complementary filters on the special orthogonal group", IEEE TAC 53(5), 2008,
// section on the explicit filter. One vector (gravity): yaw is the gyro's integral. Cycle thread, no heap.
#pragma once

#include <Eigen/Core>
#include <Eigen/Geometry>

namespace pastern::estimate {

/// Linearised about level the error obeys s^2 + kp s + ki: time constant about 1/kp, and a constant gyro bias
/// is found. The gains are low because a walking trunk accelerates; `rest` ones apply when it does not move.
struct AttitudeGains {
  double kp{0.4};   ///< 1/s
  double ki{0.02};  ///< 1/s^2
  double rest_kp{2.0};
  double rest_ki{0.6};
  double rest_yaw{2.0};  ///< 1/s, with which the yaw gyro's bias is taken from what it shows at rest
};

class AttitudeFilter {
 public:
  explicit AttitudeFilter(const AttitudeGains& gains = {}) noexcept : gains_(gains) {}

  /// Roll and pitch from one reading of gravity (specific force, +g up at rest), yaw zero, bias zero. A
  /// reading without direction leaves the filter level.
  void begin(const Eigen::Vector3d& acceleration_m_s2) noexcept;
  /// Turns about the vertical so that yaw is zero. Roll, pitch and bias stay.
  void zero_yaw() noexcept;
  /// One tick. `rate` rad/s and `acceleration` (specific force) in the body frame; `at_rest`: the trunk
  /// stands still.
  void update(const Eigen::Vector3d& rate_rad_s, const Eigen::Vector3d& acceleration_m_s2, double dt_s,
              bool at_rest) noexcept;
  /// Takes an attitude from outside (unit quaternion); the bias stays.
  void adopt(const Eigen::Quaterniond& attitude) noexcept { attitude_ = attitude; }

  /// Body to world.
  [[nodiscard]] const Eigen::Quaterniond& attitude() const noexcept { return attitude_; }
  [[nodiscard]] const Eigen::Vector3d& bias_rad_s() const noexcept { return bias_; }

 private:
  AttitudeGains gains_;
  Eigen::Quaterniond attitude_{Eigen::Quaterniond::Identity()};
  Eigen::Vector3d bias_{Eigen::Vector3d::Zero()};
};

/// Roll, pitch, yaw of the z-y-x sequence, rad; pitch in [-pi/2, pi/2], finite at the poles (where yaw is
/// zero and roll takes the whole turn about the vertical).
struct Angles {
  double roll_rad{0};
  double pitch_rad{0};
  double yaw_rad{0};
};
[[nodiscard]] Angles angles_of(const Eigen::Quaterniond& attitude) noexcept;
[[nodiscard]] Eigen::Quaterniond attitude_of(const Angles& angles) noexcept;

}  // namespace pastern::estimate
