// Explicit complementary filter and the z-y-x angles.
#include "runtime/estimate/attitude.h"

#include <algorithm>
#include <cmath>

namespace pastern::estimate {

namespace {

constexpr double kGravity = 9.80665;    // m/s^2
constexpr double kMostGravities = 2.0;  // a landing's blow must not turn the filter
constexpr double kPole = 1e-8;          // of cos pitch

/// exp of a rotation vector as a quaternion: exact for a constant rate over the tick.
Eigen::Quaterniond turn_by(const Eigen::Vector3d& vector) noexcept {
  const double angle = vector.norm();
  // sin(a/2)/a near zero: 1/2 - a^2/48
  const double factor = angle < 1e-4 ? 0.5 - angle * angle / 48.0 : std::sin(0.5 * angle) / angle;
  return {std::cos(0.5 * angle), factor * vector.x(), factor * vector.y(), factor * vector.z()};
}

}  // namespace

void AttitudeFilter::begin(const Eigen::Vector3d& acceleration_m_s2) noexcept {
  bias_.setZero();
  attitude_.setIdentity();
  const double across = std::hypot(acceleration_m_s2.y(), acceleration_m_s2.z());
  if (std::isfinite(acceleration_m_s2.norm()) && acceleration_m_s2.norm() > 0.1 * kGravity) {
    const double roll = std::atan2(acceleration_m_s2.y(), acceleration_m_s2.z());
    attitude_ = attitude_of({roll, std::atan2(-acceleration_m_s2.x(), across), 0.0});
  }
}

void AttitudeFilter::zero_yaw() noexcept {
  Angles angles = angles_of(attitude_);
  angles.yaw_rad = 0;
  attitude_ = attitude_of(angles);
}

void AttitudeFilter::update(const Eigen::Vector3d& rate_rad_s, const Eigen::Vector3d& acceleration_m_s2,
                            double dt_s, bool at_rest) noexcept {
  // The measured direction is acceleration / g, not made a unit vector: over a period of a gait the trunk's
  // own accelerations cancel in it, and they would not in the unit vector.
  Eigen::Vector3d measured = acceleration_m_s2 / kGravity;
  measured *= std::min(1.0, kMostGravities / std::max(measured.norm(), 1e-9));
  const Eigen::Vector3d expected = attitude_.conjugate() * Eigen::Vector3d::UnitZ();
  const Eigen::Vector3d error = measured.cross(expected);
  const double kp = at_rest ? gains_.rest_kp : gains_.kp;
  const double ki = at_rest ? gains_.rest_ki : gains_.ki;
  attitude_ = attitude_ * turn_by((rate_rad_s - bias_ + kp * error) * dt_s);
  attitude_.normalize();
  bias_ -= ki * error * dt_s;
  if (at_rest) {
    // Gravity says nothing about turning round the vertical; standing still does.
    const double shown = expected.dot(rate_rad_s - bias_);
    bias_ += gains_.rest_yaw * dt_s * shown * expected;
  }
}

Angles angles_of(const Eigen::Quaterniond& attitude) noexcept {
  const double w = attitude.w();
  const double x = attitude.x();
  const double y = attitude.y();
  const double z = attitude.z();
  // Entries of the rotation matrix times the squared norm, so that a quaternion a little off one unit does no
  // harm: sin pitch, cos pitch sin roll, cos pitch cos roll.
  const double sine = 2.0 * (w * y - x * z);
  const double across = 2.0 * (w * x + y * z);
  const double upward = w * w - x * x - y * y + z * z;
  const double cosine = std::hypot(across, upward);
  if (cosine < kPole) {
    // Only roll -+ yaw can be told: q = cos, sin of half of it stand in w and x.
    return {std::remainder(2.0 * std::atan2(x, w), 2.0 * M_PI), std::copysign(M_PI / 2, sine), 0.0};
  }
  return {std::atan2(across, upward), std::atan2(sine, cosine),
          std::atan2(2.0 * (w * z + x * y), w * w + x * x - y * y - z * z)};
}

Eigen::Quaterniond attitude_of(const Angles& angles) noexcept {
  return Eigen::AngleAxisd(angles.yaw_rad, Eigen::Vector3d::UnitZ()) *
         Eigen::AngleAxisd(angles.pitch_rad, Eigen::Vector3d::UnitY()) *
         Eigen::AngleAxisd(angles.roll_rad, Eigen::Vector3d::UnitX());
}

}  // namespace pastern::estimate
