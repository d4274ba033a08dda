// Running figures of a walk and what they come to.
#include "runtime/episode/recorder.h"

#include <limits>
#include <numbers>

#include "proto/files/geometry.h"

namespace pastern::episode {

namespace {

constexpr double kTracePeriod = 0.02;  // s
constexpr double kGravity = 9.80665;   // m/s^2
constexpr double kLowShare = 0.5;      // of the stance height: lower is a fall

double mass_kg(const v1::Robot& robot) {
  double mass = robot.trunk().link().mass_kg();
  for (const v1::Joint& joint : robot.joints()) {
    mass += joint.link().mass_kg();
  }
  return mass;
}

}  // namespace

FallRule fall_rule_of(const v1::Robot& robot) {
  const double tilt = robot.return_weights().fall_tilt_rad();
  return {tilt, tilt < std::numbers::pi ? std::cos(tilt) : -2, kLowShare * files::stance_height(robot),
          robot.lane().half_width_m()};
}

double tilt_rad(double roll_rad, double pitch_rad) noexcept {
  return std::acos(std::cos(roll_rad) * std::cos(pitch_rad));
}

bool fell(const FallRule& rule, const BodyEstimate<>& body) noexcept {
  const bool upright = std::cos(body.roll_rad) * std::cos(body.pitch_rad) >= rule.least_upright;
  const bool high = body.position.z >= rule.least_height_m;
  return !(upright && high);
}

bool left_lane(const FallRule& rule, const BodyEstimate<>& body) noexcept {
  return !(std::abs(body.position.y) <= rule.lane_half_width_m);
}

Outcome outcome_of(const FallRule& rule, const BodyEstimate<>& body) noexcept {
  if (fell(rule, body)) {
    return Outcome::fell;
  }
  return left_lane(rule, body) ? Outcome::left_lane : Outcome::completed;
}

bool cost_of_transport(double energy_j, double mass_kg, double distance_m, double& cost) noexcept {
  if (!(distance_m >= kLeastDistance) || !(mass_kg > 0)) {
    return false;
  }
  cost = energy_j / (mass_kg * kGravity * distance_m);
  return true;
}

EpisodeRecorder::EpisodeRecorder(const v1::Robot& robot, double longest_s)
    : weights_(weights_of(robot)), mass_kg_(mass_kg(robot)), joint_count_(robot.joints_size()) {
  samples_.reserve(static_cast<std::size_t>(longest_s / kTracePeriod) + 2);
  angles_.reserve(samples_.capacity() * static_cast<std::size_t>(joint_count_));
  begin();
}

void EpisodeRecorder::begin() noexcept {
  sums_ = {};
  duration_s_ = pack_energy_j_ = distance_m_ = 0;
  roll_square_s_ = pitch_square_s_ = roll_max_rad_ = pitch_max_rad_ = 0;
  winding_max_c_ = -std::numeric_limits<double>::infinity();
  pack_min_v_ = std::numeric_limits<double>::infinity();
  ticks_ = clamped_ticks_ = targets_clipped_ = 0;
  samples_.clear();
  angles_.clear();
}

void EpisodeRecorder::add(const TickRecord& tick, const JointAngles<>& angle, double dt_s) noexcept {
  const BodyEstimate<>& body = tick.body;
  // Half a tick of slack: sums of dt are not exact.
  if (duration_s_ + 0.5 * dt_s >= kTracePeriod * static_cast<double>(samples_.size())) {
    keep_sample(body, angle);
  }
  const TickScore<double> score{body.velocity.x, tick.power_w, body.position.y, body.yaw_rad};
  episode::add(sums_, score, weights_, dt_s);
  duration_s_ += dt_s;
  pack_energy_j_ += tick.pack_power_w * dt_s;
  distance_m_ = body.position.x;
  roll_square_s_ += body.roll_rad * body.roll_rad * dt_s;
  pitch_square_s_ += body.pitch_rad * body.pitch_rad * dt_s;
  roll_max_rad_ = std::max(roll_max_rad_, std::abs(body.roll_rad));
  pitch_max_rad_ = std::max(pitch_max_rad_, std::abs(body.pitch_rad));
  winding_max_c_ = std::max(winding_max_c_, tick.winding_max_c);
  pack_min_v_ = std::min(pack_min_v_, tick.pack_voltage_v);
  ++ticks_;
  clamped_ticks_ += tick.clamped ? 1 : 0;
  targets_clipped_ += static_cast<std::uint64_t>(std::max(tick.targets_clipped, 0));
}

void EpisodeRecorder::keep_sample(const BodyEstimate<>& body, const JointAngles<>& angle) noexcept {
  if (samples_.size() == samples_.capacity()) return;
  samples_.push_back({static_cast<float>(duration_s_), static_cast<float>(body.position.x),
                      static_cast<float>(body.position.y), static_cast<float>(body.position.z),
                      static_cast<float>(body.roll_rad), static_cast<float>(body.pitch_rad),
                      static_cast<float>(body.yaw_rad), static_cast<float>(body.velocity.x)});
  for (int j = 0; j < joint_count_; ++j) angles_.push_back(static_cast<float>(angle[j]));
}

EpisodeReturn EpisodeRecorder::terms(bool fell) const { return episode::terms(sums_, weights_, fell); }

v1::EpisodeSummary EpisodeRecorder::summary() const {
  v1::EpisodeSummary summary;
  if (ticks_ == 0) {
    return summary;
  }
  summary.set_duration_s(duration_s_);
  summary.set_distance_m(distance_m_);
  summary.set_mean_speed_m_per_s(distance_m_ / duration_s_);
  summary.set_energy_j(sums_.energy_j);
  summary.set_pack_energy_j(pack_energy_j_);
  double cost = 0;
  summary.set_moved_forward(cost_of_transport(sums_.energy_j, mass_kg_, distance_m_, cost));
  summary.set_cost_of_transport(cost);
  summary.set_roll_rms_rad(std::sqrt(roll_square_s_ / duration_s_));
  summary.set_pitch_rms_rad(std::sqrt(pitch_square_s_ / duration_s_));
  summary.set_roll_max_rad(roll_max_rad_);
  summary.set_pitch_max_rad(pitch_max_rad_);
  summary.set_winding_max_c(winding_max_c_);
  summary.set_pack_min_v(pack_min_v_);
  summary.set_clamped_share(static_cast<double>(clamped_ticks_) / static_cast<double>(ticks_));
  summary.set_targets_clipped(static_cast<std::uint32_t>(targets_clipped_));
  return summary;
}

v1::Trace EpisodeRecorder::trace() const {
  v1::Trace trace;
  for (const Sample& sample : samples_) {
    trace.add_time_s(sample.time_s);
    trace.add_x_m(sample.x_m);
    trace.add_y_m(sample.y_m);
    trace.add_roll_rad(sample.roll_rad);
    trace.add_pitch_rad(sample.pitch_rad);
    trace.add_speed_m_per_s(sample.speed_m_per_s);
    trace.add_height_m(sample.height_m);
    trace.add_yaw_rad(sample.yaw_rad);
  }
  trace.mutable_joint_angle_rad()->Add(angles_.begin(), angles_.end());
  return trace;
}

}  // namespace pastern::episode
