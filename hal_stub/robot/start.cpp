// Scalar double; the same numbers whoever asks.
#include "hal_stub/robot/start.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "hal_stub/robot/random.h"

namespace pastern::stub {
namespace {

constexpr double kPushEarliestSeconds = 0.5;  // since a walk could begin
constexpr double kPushLatestSeconds = 4.5;

/// Rotation by a rotation vector.
Rotation<double> rotation_by(const std::array<double, 3>& v) {
  const double angle = std::sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2]);
  const double k = angle > 0 ? std::sin(angle / 2) / angle : 0.5;
  return rotation_of(Quat<double>{std::cos(angle / 2), v[0] * k, v[1] * k, v[2] * k});
}

/// The trunk with a point load rigidly on it.
TrunkFigures<double> loaded_trunk(const LinkFigures<double>& trunk, double load,
                                  const std::array<double, 3>& at) {
  const Vec3<double> where{at[0], at[1], at[2]};
  const double mass = trunk.mass + load;
  const Vec3<double> centre = (trunk.centre * trunk.mass + where * load) * (1 / mass);
  const Vec3<double> d = where - trunk.centre;
  const double m =
      trunk.mass * load / mass;  // reduced mass: parallel-axis terms of both about the common centre
  const auto& i = trunk.inertia;
  return {
      mass,
      centre,
      {i.xx + m * (d.y * d.y + d.z * d.z), i.yy + m * (d.x * d.x + d.z * d.z),
       i.zz + m * (d.x * d.x + d.y * d.y), i.xy - m * d.x * d.y, i.xz - m * d.x * d.z, i.yz - m * d.y * d.z}};
}

bool hangs_at(const Site& site) { return site.load_hangs_m > 0 && site.load_kg > 0; }

// The strap: stretched by a millimetre under the load at rest, and half critically damped along itself, so
// that it is seen by nobody and calm at steps of a millisecond. Ours.
constexpr double kStrapStretch = 0.001;  // m
constexpr double kStrapDamping = 0.5;

/// Swing damped as a pendulum of that length: 2 zeta m sqrt(g / l).
Hanging<double> hanging_of(const Site& site, double gravity) {
  const double mass = site.load_kg;
  const double stiffness = mass * gravity / kStrapStretch;
  return {{site.load_at_m[0], site.load_at_m[1], site.load_at_m[2]},
          site.load_hangs_m - kStrapStretch,
          stiffness,
          2 * kStrapDamping * std::sqrt(stiffness * mass),
          2 * site.load_swing_damping * mass * std::sqrt(gravity / site.load_hangs_m),
          1 / mass};
}

LinkFigures<double> own_trunk(const LinkFigures<double>& trunk, const Site& site) {
  LinkFigures<double> made = trunk;
  const double k = site.trunk_inertia_ratio;
  auto& i = made.inertia;
  if (k != 1) i = {i.xx * k, i.yy * k, i.zz * k, i.xy * k, i.xz * k, i.yz * k};
  return made;
}

void take_links(const Model& model, const Site& site, TrunkFigures<double>& trunk) {
  const auto& tree = model.figures().tree;
  for (auto& limb : trunk.link_ratio) limb.fill(1);
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      const double ratio = site.link_ratio[static_cast<std::size_t>(tree.leg[l].joint[i].order)];
      trunk.link_ratio[l][i] = ratio;
      trunk.weighed = trunk.weighed || ratio != 1;
    }
  }
}

constexpr double kShortestRiser = 0.004;  // m: a foot at 2 m/s is on it for two steps
// m: no riser is more curved than this ball, so that a foot touches it in one place. At its ends 3 u^2 - 2
// u^3 of a rise h over a length l has the curvature 6 h / l^2.
constexpr double kRoundestBall = 0.03;

double riser_length(double height) {
  const double h = std::fabs(height);
  return std::max({h, std::sqrt(6 * h * kRoundestBall), kShortestRiser});
}

/// Waves and steps; the highest they can reach is the sum of all that rises.
Relief<double> relief_of(const GroundShape& shape) {
  Relief<double> relief;
  relief.waves = shape.wave_height_m > 0;
  relief.amplitude = relief.waves ? shape.wave_height_m / 2 : 0;
  relief.wave_number = 2 * std::numbers::pi / shape.wave_length_m;
  relief.top = relief.amplitude;
  relief.riser_count = std::min(shape.step_count, kMaxRisers);
  for (std::size_t i = 0; i < static_cast<std::size_t>(relief.riser_count); ++i) {
    const GroundStep& step = shape.step[i];
    relief.riser[i] = {step.at_m, step.height_m, 1 / riser_length(step.height_m)};
    relief.top += std::max(step.height_m, 0.0);
  }
  return relief;
}

}  // namespace

Ground<double> ground_of(const Site& site) {
  const GroundShape& shape = site.ground;
  Ground<double> ground;
  ground.normal = {-std::sin(site.slope_rad), 0, std::cos(site.slope_rad)};
  ground.friction = site.friction;
  ground.stiffness = site.ground_stiffness_n_per_m;
  ground.damping = site.ground_damping_n_s_per_m;
  ground.stick_speed = shape.stick_speed_m_per_s;
  ground.peak = shape.stick_ratio - 1;
  ground.fading = shape.friction_fall;
  ground.bounce = shape.damping_rise_s_per_m;
  ground.relief = relief_of(shape);
  ground.patch_count = std::min(shape.patch_count, kMaxPatches);
  for (std::size_t i = 0; i < static_cast<std::size_t>(ground.patch_count); ++i) {
    const GroundPatch& patch = shape.patch[i];
    ground.patch[i] = {patch.from_m, patch.to_m, patch.right_m, patch.left_m, patch.friction};
  }
  ground.plain = !ground.relief.waves && ground.relief.riser_count == 0 && ground.patch_count == 0 &&
                 !(ground.peak > 0) && !(ground.fading > 0) && !(ground.bounce > 0);
  return ground;
}

SiteFigures<double> figures_of(const Model& model, const Site& site) {
  const auto& base = model.figures();
  SiteFigures<double> made;
  auto& around = made.around;
  const bool hangs = hangs_at(site);
  around.trunk = loaded_trunk(own_trunk(base.tree.trunk, site), hangs ? 0 : site.load_kg, site.load_at_m);
  take_links(model, site, around.trunk);
  around.hangs = hangs;
  if (hangs) around.hanging = hanging_of(site, base.tree.gravity);
  around.ground = ground_of(site);
  for (std::size_t j = 0; j < static_cast<std::size_t>(model.joint_count()); ++j) {
    made.drives.strength[j] = site.strength[j];
    made.drives.damping[j] = site.damping_nm_s_per_rad[j];
    made.drives.coulomb[j] = site.coulomb_nm[j];
    made.drives.half_gap[j] = site.backlash_rad[j] / 2;
    made.drives.loss[j] = site.gear_loss[j];
    made.drives.stick[j] = site.stick_nm[j];
    made.drives.plain = made.drives.plain && !(site.gear_loss[j] > 0) && !(site.stick_nm[j] > 0);
  }
  made.drives.plain = made.drives.plain && !model.limited();
  made.drives.ambient = site.ambient_c;
  made.pack.open_scale = 0;
  made.pack.resistance = base.pack.resistance * site.pack_resistance_ratio;
  made.pack.resistance *= cold_resistance(model.cold_ratio(), site.pack_c);
  return made;
}

RobotState<double> switch_on(const Model& model, const Site& site, PackSite<double>& pack) {
  RobotState<double> state;
  const double ratio = site.pack_voltage_ratio;
  state.pack.charge = std::clamp(0.7 + 1.5 * (ratio - 1), 0.15, 1.0);
  state.pack.voltage = ratio * model.figures().pack.nominal;
  pack.open_scale = state.pack.voltage / open_voltage(state.pack.charge);
  for (std::size_t j = 0; j < static_cast<std::size_t>(model.joint_count()); ++j) {
    state.drives.winding[j] = site.winding_start_c;
    state.drives.housing[j] = site.winding_start_c;
  }
  return state;
}

Vec3<double> rate_bias_of(const Model& model, const Site& site, std::uint64_t seed) {
  const double sd = model.sensors().rate_bias_rad_per_s() * site.sensor_noise_ratio;
  const Words a = random_words(seed, 0, 0, Chance::robot, 0);
  const Words b = random_words(seed, 0, 0, Chance::robot, 1);
  return {sd * normal_of(a[0], a[1]), sd * normal_of(a[2], a[3]), sd * normal_of(b[0], b[1])};
}

Rotation<double> imu_axes_of(const Site& site) { return rotation_by(site.imu_tilt_rad); }

void place_in(const Model& model, const Site& site, const std::vector<double>& pose, std::uint64_t seed,
              std::uint64_t draw, RobotState<double>& state) {
  const double scatter = site.start_scatter_rad;
  const auto& tree = model.figures().tree;
  std::array<double, safety::kMaxJoints> angle{};
  state.body = {};
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      const auto& joint = tree.leg[l].joint[i];
      const auto j = static_cast<std::size_t>(joint.order);
      const Words w = random_words(seed, draw, 0, Chance::place, static_cast<std::uint32_t>(j) + 1);
      angle[j] = std::clamp(pose[j] + scatter * normal_of(w[0], w[1]), joint.angle_min, joint.angle_max);
      state.body.angle[l][i] = angle[j];
      state.drives.rotor_angle[j] = angle[j];
      state.drives.rotor_speed[j] = 0;
      state.drives.torque[j] = 0;
      state.drives.wound[j] = 0;
    }
  }
  const Words w = random_words(seed, draw, 0, Chance::place, 0);
  const double yaw = scatter * normal_of(w[0], w[1]);
  const double half = -site.slope_rad / 2;  // nose up the slope
  const Quat<double> slope{std::cos(half), 0, std::sin(half), 0};
  state.body.attitude = slope * Quat<double>{std::cos(yaw / 2), 0, 0, std::sin(yaw / 2)};
  const double sink =
      model.mass_kg() * tree.gravity / site.ground_stiffness_n_per_m / std::max(1, tree.leg_count);
  const Ground<double> ground = ground_of(site);
  const double reach = ground.plain ? reach_below(tree, angle.data(), {0, 0, -1})
                                    : rest_height(tree, angle.data(), state.body.attitude, ground);
  state.body.position = ground.normal * (reach - sink);
  const Vec3<double> at{site.load_at_m[0], site.load_at_m[1], site.load_at_m[2]};
  if (hangs_at(site)) {
    state.body.swing.place = rotation_of(state.body.attitude) * at - Vec3<double>{0, 0, site.load_hangs_m};
  }
}

Push push_of(const Model& model, const Site& site, std::uint64_t seed, std::uint64_t draw) {
  const Words p = random_words(seed, draw, 0, Chance::push, 0);
  const Words q = random_words(seed, draw, 0, Chance::push, 1);
  const double mass = mass_at(model, site);
  const double size = site.push_m_per_s * normal_of(p[0], p[1]) * mass / kPushSeconds;
  const double way = 2 * std::numbers::pi * uniform_of(p[2]);
  return {{size * std::cos(way), size * std::sin(way), 0},
          kPushEarliestSeconds + (kPushLatestSeconds - kPushEarliestSeconds) * uniform_of(q[0])};
}

std::size_t sensor_delay_ticks(const Model& model, const Site& site) {
  return static_cast<std::size_t>(std::lround(site.sensor_delay_s / model.period_s()));
}

std::size_t imu_delay_ticks(const Model& model, const Site& site) {
  if (site.imu_delay_s < 0) return sensor_delay_ticks(model, site);
  return static_cast<std::size_t>(std::lround(site.imu_delay_s / model.period_s()));
}

FrameFlaws frame_flaws_of(const Model& model, const Site& site) {
  const long late = std::lround(site.frames_late_s / model.period_s());
  return {site.frames_late, site.frames_repeated, static_cast<std::uint32_t>(std::max(1L, late))};
}

std::size_t oldest_sample_ticks(const Model& model, const Site& site) {
  return std::max(sensor_delay_ticks(model, site), imu_delay_ticks(model, site)) +
         oldest_news(frame_flaws_of(model, site));
}

double mass_at(const Model& model, const Site& site) {
  double mass = model.mass_kg() + site.load_kg;
  const auto& tree = model.figures().tree;
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      const auto& joint = tree.leg[l].joint[i];
      mass += (site.link_ratio[static_cast<std::size_t>(joint.order)] - 1) * joint.link.mass;
    }
  }
  return mass;
}

long command_delay_ticks(const Model& model, const Site& site, double chance) {
  double late = site.command_delay_s;
  if (site.command_jitter_s > 0) late += site.command_jitter_s * chance;
  return std::lround(late / model.period_s());
}

}  // namespace pastern::stub
