// The gate's own idea of which way is up: a complementary filter of gyro against gravity. Raw IMU only, body
// frame (x forward, y left, z up). Knows nothing of the estimator that it guards against.
#pragma once

#include "safety/units.h"

namespace pastern::safety {

/// Standard gravity, CGPM 1901 (exact by definition).
inline constexpr double kGravity = 9.80665;

class TiltFilter {
 public:
  /// One IMU sample, `span_s` after the last. `time_constant_s`: how fast the accelerometer is believed.
  /// The accelerometer is used for the direction of gravity only while its size is near that of gravity;
  /// otherwise (landing, push, free fall, broken) the gyro alone carries on. The first 0.05 s of such samples
  /// are averaged; until there is one, the first direction of any size stands. Values that are not finite
  /// change nothing. `time_constant_s` is the same in all calls.
  void follow(const Vector3<RadianPerSecond, Body>& rate,
              const Vector3<MetrePerSecondSquared, Body>& acceleration, double span_s,
              double time_constant_s) noexcept;
  /// Forgets. Until a sample has told which way is up, the robot counts as upside down (roll = pi).
  void reset() noexcept { *this = TiltFilter{}; }

  /// z-y-x (aerospace) angles from the direction of up in the body, u = R^T z:
  /// roll = atan2(u_y, u_z), pitch = atan2(-u_x, sqrt(u_y^2 + u_z^2)). rad.
  [[nodiscard]] double roll() const noexcept;
  [[nodiscard]] double pitch() const noexcept;
  /// Unit vector, up, written in the body frame.
  [[nodiscard]] const Vector3<Metre, Body>& up() const noexcept { return up_; }

 private:
  void turn(const Vector3<RadianPerSecond, Body>& rate, double span_s) noexcept;
  void lean(const Vector3<MetrePerSecondSquared, Body>& acceleration, double size, double weight) noexcept;

  [[nodiscard]] double weight_of(double span_s, double time_constant_s) noexcept;

  Vector3<Metre, Body> up_{0.0, 0.0, -1.0};
  bool known_{false};
  double believed_s_{0.0};  // time of the samples near gravity's size, until the first direction is had
  double weighed_s_{0.0};   // span that weight_ belongs to
  double weight_{0.0};
};

}  // namespace pastern::safety
