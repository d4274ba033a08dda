// Speed and place of the trunk from the legs that stand, steadied by the accelerometer, or from an external
// source of place. World frame: x along the lane, origin and heading at the start of the walk. Cycle thread;
// no heap.
#pragma once

#include <Eigen/Core>
#include <Eigen/Geometry>
#include <array>

#include "runtime/estimate/legs.h"

namespace pastern::estimate {

struct OdometryGains {
  double velocity_s{0.06};        ///< time constant towards the legs' velocity while a leg stands
  double height_s{0.02};          ///< towards the legs' height
  double push_s{0.006};           ///< low-pass of each foot's push
  double light_share{0.06};       ///< of the robot's weight: a foot that pushes less does not stand ...
  double firm_share{0.4};         ///< ... one that pushes more does
  double raised_m{0.03};          ///< a foot this much over the lowest does not stand, however it pushes
  double blind_m{0.01};           ///< the same when no foot is known to push
  double slip_m_per_s{0.15};      ///< a foot that contradicts the rest by this much is believed a quarter
  double least_belief{0.15};      ///< of the legs together, however far they are from what was expected
  double external_s{0.08};        ///< time constant of the filter on an external place
  double external_stale_s{0.25};  ///< an external place older than this is not relied on
};

class Odometry {
 public:
  Odometry(const Legs& legs, double weight_n, const OdometryGains& gains = {}) noexcept;

  /// Start of a walk: place and speed zero, height from the legs.
  void begin(const safety::SensorFrame& frame, const Eigen::Quaterniond& attitude) noexcept;
  /// One tick. `rate`: body rate without bias, rad/s.
  void update(const safety::SensorFrame& frame, const Eigen::Quaterniond& attitude,
              const Eigen::Vector3d& rate_rad_s, double dt_s) noexcept;

  [[nodiscard]] const Eigen::Vector3d& velocity_m_s() const noexcept { return velocity_; }
  /// z: height of the trunk's origin over the ground under the standing feet.
  [[nodiscard]] const Eigen::Vector3d& position_m() const noexcept { return position_; }
  /// 0 swings, 1 stands.
  [[nodiscard]] double stance(int leg) const noexcept { return stance_[static_cast<std::size_t>(leg)]; }

 private:
  struct LegView {
    Eigen::Vector3d velocity_m_s{
        Eigen::Vector3d::Zero()};  // of the trunk, if every leg of weight stood; world
    double height_m{0};            // of the trunk
    double weight{0};              // 0..1: how sure it is that any leg stands
  };
  [[nodiscard]] LegView look(const safety::SensorFrame& frame, const Eigen::Quaterniond& attitude,
                             const Eigen::Vector3d& rate_rad_s, double dt_s) noexcept;
  [[nodiscard]] LegView put_together(const Eigen::Quaterniond& attitude, const Eigen::Vector3d& rate_rad_s,
                                     double height_m) const noexcept;
  void judge_stance(double lowest_m, double dt_s) noexcept;
  void follow_external(const safety::SensorFrame& frame, double dt_s) noexcept;

  Legs legs_;
  double weight_n_;
  OdometryGains gains_;
  std::array<FootState, kMostLegs> foot_{};
  std::array<double, kMostLegs>
      foot_height_m_{};  // of the touching point against the trunk's origin, world z
  std::array<double, kMostLegs> push_n_{};
  std::array<double, kMostLegs> stance_{};
  Eigen::Vector3d velocity_{Eigen::Vector3d::Zero()};
  Eigen::Vector3d position_{Eigen::Vector3d::Zero()};
  Eigen::Vector3d external_origin_{Eigen::Vector3d::Zero()};
  Eigen::Vector3d external_last_{Eigen::Vector3d::Zero()};
  double external_age_s_{0};  // since the external place last changed
  bool external_known_{false};
};

}  // namespace pastern::estimate
