// Turns the up vector by the gyro exactly, then leans it towards the accelerometer.
#include "safety/tilt.h"

#include <cmath>

namespace pastern::safety {
namespace {

// Between half and one and a half of gravity: a trot's vertical acceleration passes, a landing shock or free
// fall does not. Common practice, no source.
constexpr double kLeastSize = 0.5 * kGravity;
constexpr double kMostSize = 1.5 * kGravity;

// The first direction is the mean of so long: a robot that has just been put down may still fall the last few
// millimetres, and one sample of that tells nothing.
constexpr double kFirstDirection_s = 0.05;

template <class Unit>
bool finite(const Vector3<Unit, Body>& v) noexcept {
  return std::isfinite(v.x) && std::isfinite(v.y) && std::isfinite(v.z);
}

template <class Unit>
double length(const Vector3<Unit, Body>& v) noexcept {
  return std::sqrt(v.x * v.x + v.y * v.y + v.z * v.z);
}

}  // namespace

void TiltFilter::follow(const Vector3<RadianPerSecond, Body>& rate,
                        const Vector3<MetrePerSecondSquared, Body>& acceleration, double span_s,
                        double time_constant_s) noexcept {
  if (finite(rate)) turn(rate, span_s);
  if (!finite(acceleration)) return;
  const double size = length(acceleration);
  if (!known_) {
    // For want of a better one, of whatever size; no direction, no start.
    if (size > 1e-3 && std::isfinite(size)) lean(acceleration, size, 1.0);
    if (!known_) return;
  }
  if (!(size >= kLeastSize && size <= kMostSize)) return;
  const double weight = weight_of(span_s, time_constant_s);
  if (weight >= 0.0 && weight <= 1.0) lean(acceleration, size, weight);
}

double TiltFilter::weight_of(double span_s, double time_constant_s) noexcept {
  if (span_s != weighed_s_) {
    weighed_s_ = span_s;
    weight_ = -std::expm1(-span_s / time_constant_s);
  }
  if (!(believed_s_ < kFirstDirection_s) || !(span_s > 0.0)) return weight_;
  believed_s_ += span_s;
  const double mean = span_s / believed_s_;
  return mean > weight_ ? mean : weight_;
}

/// A direction fixed in the world turns in the body by -rate: Rodrigues' rotation about the unit axis k,
/// u' = u cos a + (k x u) sin a + k (k.u)(1 - cos a), a = -|rate| span.
void TiltFilter::turn(const Vector3<RadianPerSecond, Body>& rate, double span_s) noexcept {
  const double speed = length(rate);
  const double angle = -speed * span_s;
  if (!known_ || !(speed > 0.0) || !std::isfinite(angle)) return;
  const double x = rate.x / speed;
  const double y = rate.y / speed;
  const double z = rate.z / speed;
  const double c = std::cos(angle);
  const double s = std::sin(angle);
  const double along = (x * up_.x + y * up_.y + z * up_.z) * (1.0 - c);
  up_ = {up_.x * c + (y * up_.z - z * up_.y) * s + x * along,
         up_.y * c + (z * up_.x - x * up_.z) * s + y * along,
         up_.z * c + (x * up_.y - y * up_.x) * s + z * along};
}

void TiltFilter::lean(const Vector3<MetrePerSecondSquared, Body>& acceleration, double size,
                      double weight) noexcept {
  const Vector3<Metre, Body> mixed{up_.x + weight * (acceleration.x / size - up_.x),
                                   up_.y + weight * (acceleration.y / size - up_.y),
                                   up_.z + weight * (acceleration.z / size - up_.z)};
  const double mixed_size = length(mixed);
  if (!(mixed_size > 1e-6)) return;  // exactly opposite: wait for the gyro or the next sample
  up_ = {mixed.x / mixed_size, mixed.y / mixed_size, mixed.z / mixed_size};
  known_ = true;
}

double TiltFilter::roll() const noexcept { return std::atan2(up_.y, up_.z); }

double TiltFilter::pitch() const noexcept {
  return std::atan2(-up_.x, std::sqrt(up_.y * up_.y + up_.z * up_.z));
}

}  // namespace pastern::safety
