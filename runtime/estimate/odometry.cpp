// Leg odometry: which legs stand, what they say about the trunk, how it is put together with the
// accelerometer.
#include "runtime/estimate/odometry.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace pastern::estimate {

namespace {

constexpr double kGravity = 9.80665;  // m/s^2
constexpr double kNothing = 1e-9;
constexpr double kStands = 0.05;  // of stance: from here a leg is asked

/// Share of the way that a first-order lag of time constant tau goes in dt.
double lag(double dt_s, double tau_s) noexcept { return 1.0 - std::exp(-dt_s / tau_s); }

/// 0 at and below `from`, 1 at and above `to`.
double ramp(double value, double from, double to) noexcept {
  return std::clamp((value - from) / (to - from), 0.0, 1.0);
}

/// How far a foot whose word is `apart` from what was expected is believed: one that slides or swings under
/// load says the trunk is slow. Weight of the bisquare's kin with long tails, (1 + (d/c)^2)^-2: never quite
/// zero.
double agreement(double apart_m_per_s, double slip_m_per_s) noexcept {
  const double ratio = apart_m_per_s / slip_m_per_s;
  const double weight = 1.0 / (1.0 + ratio * ratio);
  return weight * weight;
}

Eigen::Vector3d vector(const safety::Vector3<safety::Metre, safety::World>& v) noexcept {
  return {v.x, v.y, v.z};
}

}  // namespace

Odometry::Odometry(const Legs& legs, double weight_n, const OdometryGains& gains) noexcept
    : legs_(legs), weight_n_(weight_n), gains_(gains) {}

void Odometry::begin(const safety::SensorFrame& frame, const Eigen::Quaterniond& attitude) noexcept {
  velocity_.setZero();
  position_.setZero();
  push_n_.fill(0);
  external_known_ = frame.has_position;
  external_origin_ = vector(frame.position);
  external_last_ = external_origin_;
  external_age_s_ = 0;
  position_.z() =
      look(frame, attitude, Eigen::Vector3d::Zero(), std::numeric_limits<double>::infinity()).height_m;
}

void Odometry::update(const safety::SensorFrame& frame, const Eigen::Quaterniond& attitude,
                      const Eigen::Vector3d& rate_rad_s, double dt_s) noexcept {
  const Eigen::Vector3d force(frame.acceleration.x, frame.acceleration.y, frame.acceleration.z);
  velocity_ += (attitude * force - kGravity * Eigen::Vector3d::UnitZ()) * dt_s;
  const LegView legs = look(frame, attitude, rate_rad_s, dt_s);
  // A source of place knows of slipping feet: while it speaks, the legs tell the vertical only.
  const bool external = external_known_ && external_age_s_ < gains_.external_stale_s;
  const Eigen::Vector3d trust(external ? 0.0 : 1.0, external ? 0.0 : 1.0, 1.0);
  velocity_ += legs.weight * lag(dt_s, gains_.velocity_s) * trust.cwiseProduct(legs.velocity_m_s - velocity_);
  position_ += velocity_ * dt_s;
  position_.z() += lag(dt_s, gains_.height_s) * (legs.height_m - position_.z());
  follow_external(frame, dt_s);
}

Odometry::LegView Odometry::look(const safety::SensorFrame& frame, const Eigen::Quaterniond& attitude,
                                 const Eigen::Vector3d& rate_rad_s, double dt_s) noexcept {
  const Eigen::Vector3d up = attitude.conjugate() * Eigen::Vector3d::UnitZ();
  double lowest = std::numeric_limits<double>::infinity();
  for (std::size_t i = 0; i < static_cast<std::size_t>(legs_.count); ++i) {
    foot_[i] = foot_state(legs_.leg[i], frame, up);
    foot_height_m_[i] = foot_[i].at_m.dot(up);
    lowest = std::min(lowest, foot_height_m_[i]);
  }
  judge_stance(lowest, dt_s);
  return put_together(attitude, rate_rad_s, -lowest);
}

Odometry::LegView Odometry::put_together(const Eigen::Quaterniond& attitude,
                                         const Eigen::Vector3d& rate_rad_s, double height_m) const noexcept {
  std::array<Eigen::Vector3d, kMostLegs> told;
  std::array<double, kMostLegs> apart{};
  double least_apart = std::numeric_limits<double>::infinity();
  double standing = 0;
  for (std::size_t i = 0; i < static_cast<std::size_t>(legs_.count); ++i) {
    // A foot that stands still: trunk velocity + rate x foot + foot's own velocity against the trunk = 0.
    told[i] = attitude * -(rate_rad_s.cross(foot_[i].at_m) + foot_[i].velocity_m_s);
    apart[i] = (told[i] - velocity_).norm();
    if (stance_[i] > kStands) {
      least_apart = std::min(least_apart, apart[i]);
    }
    standing += stance_[i];
  }
  LegView view;
  view.height_m = height_m;
  if (!(standing > kStands)) {
    return view;
  }
  // Legs are weighed against the one that agrees best, and all of them against what was expected.
  least_apart = std::isfinite(least_apart) ? least_apart : 0.0;
  double sum = 0;
  double height = 0;
  Eigen::Vector3d velocity = Eigen::Vector3d::Zero();
  for (std::size_t i = 0; i < static_cast<std::size_t>(legs_.count); ++i) {
    const double weight = stance_[i] * agreement(std::max(apart[i] - least_apart, 0.0), gains_.slip_m_per_s);
    velocity += weight * told[i];
    height -= stance_[i] * foot_height_m_[i];
    sum += weight;
  }
  view.velocity_m_s = velocity / std::max(sum, kNothing);
  view.height_m = height / standing;
  // Were the expectation wrong and not the legs, it must come back: slowly, but it must.
  view.weight =
      std::min(sum, 1.0) * std::max(agreement(least_apart, gains_.slip_m_per_s), gains_.least_belief);
  return view;
}

void Odometry::judge_stance(double lowest_m, double dt_s) noexcept {
  double pushed = 0;
  for (std::size_t i = 0; i < static_cast<std::size_t>(legs_.count); ++i) {
    push_n_[i] += lag(dt_s, gains_.push_s) * (foot_[i].push_n - push_n_[i]);
    pushed += std::max(push_n_[i], 0.0);
  }
  // Torques that carry nothing tell nothing (in flight, limp, or drives without a measurement): then the
  // lowest feet are taken to stand, as far as the push is missing.
  const double blind = 1.0 - ramp(pushed, gains_.light_share * weight_n_, gains_.firm_share * weight_n_);
  for (std::size_t i = 0; i < static_cast<std::size_t>(legs_.count); ++i) {
    const double over = foot_height_m_[i] - lowest_m;
    const double firm = ramp(push_n_[i], gains_.light_share * weight_n_, gains_.firm_share * weight_n_);
    stance_[i] = std::max(firm * (1.0 - ramp(over, 0.5 * gains_.raised_m, gains_.raised_m)),
                          blind * (1.0 - ramp(over, 0.5 * gains_.blind_m, gains_.blind_m)));
  }
}

void Odometry::follow_external(const safety::SensorFrame& frame, double dt_s) noexcept {
  external_age_s_ += dt_s;
  if (!frame.has_position) {
    return;
  }
  const Eigen::Vector3d place = vector(frame.position);
  if (!external_known_) {
    // It appears in the middle of a walk: it goes on from where odometry stands.
    external_known_ = true;
    external_origin_ = place - position_;
    external_last_ = place;
    external_age_s_ = 0;
    return;
  }
  if (place == external_last_) {
    return;
  }
  // Fading-memory filter of first order (critically damped g-h filter): theta = exp(-T / tau),
  // g = 1 - theta^2, h = (1 - theta)^2, T the time since the source's last news. Height stays the legs'.
  const double theta = std::exp(-external_age_s_ / gains_.external_s);
  const Eigen::Vector3d error = (place - external_origin_) - position_;
  for (int axis = 0; axis < 2; ++axis) {
    position_(axis) += (1 - theta * theta) * error(axis);
    velocity_(axis) += (1 - theta) * (1 - theta) / external_age_s_ * error(axis);
  }
  external_last_ = place;
  external_age_s_ = 0;
}

}  // namespace pastern::estimate
