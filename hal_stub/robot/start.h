// How a simulated robot begins: what a site makes of its figures, switched on, placed on its mark, and the
// push that a walk will meet. All chance is a pure function of (seed, draw). Plain functions of plain values;
// walks in lanes begin by the same.
#pragma once

#include <cstdint>
#include <vector>

#include "hal_stub/robot/frames.h"
#include "hal_stub/robot/model.h"
#include "hal_stub/robot/robot_state.h"
#include "hal_stub/robot/site.h"

namespace pastern::stub {

inline constexpr double kPushSeconds = 0.1;        ///< a push lasts
inline constexpr double kLetGoAfterSeconds = 0.5;  ///< of damping by the drives themselves

/// The ground of a site; plain when the site names nothing but slope, friction, stiffness, damping and the
/// sticking speed.
[[nodiscard]] Ground<double> ground_of(const Site& site);

/// Everything but pack.open_scale, which holds for one charge and is set by switch_on().
[[nodiscard]] SiteFigures<double> figures_of(const Model& model, const Site& site);

/// A fresh robot: pack and windings as the site says, body at nothing yet.
[[nodiscard]] RobotState<double> switch_on(const Model& model, const Site& site, PackSite<double>& pack);

/// The gyro's bias, for as long as the robot is on.
[[nodiscard]] Vec3<double> rate_bias_of(const Model& model, const Site& site, std::uint64_t seed);

/// From true body axes to those of the IMU as it is mounted.
[[nodiscard]] Rotation<double> imu_axes_of(const Site& site);

/// In `pose` (rad, joint order) with the site's scatter, feet on the ground, at rest. Heat and charge stay.
void place_in(const Model& model, const Site& site, const std::vector<double>& pose, std::uint64_t seed,
              std::uint64_t draw, RobotState<double>& state);

/// The push of a walk.
struct Push {
  Vec3<double> force{};  ///< on the trunk, world axes, N
  double begins_s{0};    ///< after the first moment at which a walk could begin
};
[[nodiscard]] Push push_of(const Model& model, const Site& site, std::uint64_t seed, std::uint64_t draw);

/// Mask: a push acts `since` seconds after the robot was placed.
[[nodiscard]] inline bool pushes(double begins_s, double since) noexcept {
  return since >= begins_s && since < begins_s + kPushSeconds;
}

/// Periods that a sampling takes to arrive.
[[nodiscard]] std::size_t sensor_delay_ticks(const Model& model, const Site& site);

/// The same of the IMU's part.
[[nodiscard]] std::size_t imu_delay_ticks(const Model& model, const Site& site);

/// How frames come late or twice at a site.
[[nodiscard]] FrameFlaws frame_flaws_of(const Model& model, const Site& site);

/// Oldest sampling that a frame may tell of, ticks.
[[nodiscard]] std::size_t oldest_sample_ticks(const Model& model, const Site& site);

/// Of robot and load, kg.
[[nodiscard]] double mass_at(const Model& model, const Site& site);

/// Periods that a command takes to arrive; `chance` in (0, 1) of the jitter.
[[nodiscard]] long command_delay_ticks(const Model& model, const Site& site, double chance);

}  // namespace pastern::stub
