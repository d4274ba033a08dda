// One walk, tick by tick: sums of the return, figures for the summary, a trace at 50 Hz. Cycle thread while a
// walk lasts, anybody afterwards. All memory is taken when the recorder is made.
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <vector>

#include "runtime/episode/score.h"

namespace pastern::episode {

/// Sum over joints of |torque * speed|, W: the power that the return pays for, whichever way it flows.
template <class S>
[[nodiscard]] S joint_power(const Torques<S>& torque, const JointSpeeds<S>& speed, int joint_count) noexcept {
  using std::abs;
  S power = S(0);
  for (int j = 0; j < joint_count; ++j) {
    power = power + abs(torque[j] * speed[j]);
  }
  return power;
}

/// When a walk is over early. A value that is not a number counts as fallen.
struct FallRule {
  double tilt_rad{0};  ///< of the body's z axis from the vertical
  double least_upright{
      1};  ///< its cosine: what a tick compares, without an arc cosine; -2 beyond half a turn
  double least_height_m{0};  ///< half of the trunk's height over the feet in the stance
  double lane_half_width_m{0};
};
[[nodiscard]] FallRule fall_rule_of(const v1::Robot& robot);  // a checked robot

/// Angle between the body's z axis and the vertical: acos(cos roll cos pitch).
[[nodiscard]] double tilt_rad(double roll_rad, double pitch_rad) noexcept;
[[nodiscard]] bool fell(const FallRule& rule, const BodyEstimate<>& body) noexcept;
[[nodiscard]] bool left_lane(const FallRule& rule, const BodyEstimate<>& body) noexcept;
/// `fell` before `left_lane` before `completed`.
[[nodiscard]] Outcome outcome_of(const FallRule& rule, const BodyEstimate<>& body) noexcept;

/// Cost of transport E / (m g d), dimensionless; false when the robot did not get `kLeastDistance` forward,
/// since it has no meaning then. g = 9.80665 m/s^2 (standard acceleration of free fall, ISO 80000-3).
[[nodiscard]] bool cost_of_transport(double energy_j, double mass_kg, double distance_m,
                                     double& cost) noexcept;
inline constexpr double kLeastDistance = 0.05;  ///< m

/// What one tick of a walk gives to the record.
struct TickRecord {
  BodyEstimate<> body;
  double power_w{0};       ///< joint_power() of measured torques and speeds
  double pack_power_w{0};  ///< pack voltage times pack current
  double pack_voltage_v{0};
  double winding_max_c{0};
  bool clamped{false};     ///< the gate changed a wanted torque
  int targets_clipped{0};  ///< of a policy step in this tick, 0 in ticks without one
};

class EpisodeRecorder {
 public:
  explicit EpisodeRecorder(const v1::Robot& robot, double longest_s = 60);

  /// A new walk. No heap.
  void begin() noexcept;
  /// The caller stops adding at a fall: nothing is earned after it. `angle`: as the encoders gave it. No
  /// heap.
  void add(const TickRecord& tick, const JointAngles<>& angle, double dt_s) noexcept;

  [[nodiscard]] double duration_s() const noexcept { return duration_s_; }
  [[nodiscard]] EpisodeReturn terms(bool fell) const;
  [[nodiscard]] v1::EpisodeSummary summary() const;
  /// Samples beyond the longest walk are not kept.
  [[nodiscard]] v1::Trace trace() const;

 private:
  struct Sample {
    float time_s, x_m, y_m, height_m, roll_rad, pitch_rad, yaw_rad, speed_m_per_s;
  };
  void keep_sample(const BodyEstimate<>& body, const JointAngles<>& angle) noexcept;

  Weights weights_;
  double mass_kg_{0};
  int joint_count_{0};
  ReturnSums<double> sums_;
  double duration_s_{0};
  double pack_energy_j_{0};
  double distance_m_{0};
  double roll_square_s_{0};
  double pitch_square_s_{0};
  double roll_max_rad_{0};
  double pitch_max_rad_{0};
  double winding_max_c_{0};
  double pack_min_v_{0};
  std::uint64_t ticks_{0};
  std::uint64_t clamped_ticks_{0};
  std::uint64_t targets_clipped_{0};
  std::vector<Sample> samples_;  // reserved once, never grown
  std::vector<float> angles_;    // joint order, a row a sample; likewise
};

}  // namespace pastern::episode
