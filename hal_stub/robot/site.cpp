// Scenario file -> site.
#include "hal_stub/robot/site.h"

#include <algorithm>

#include "hal_stub/robot/model.h"
#include "hal_stub/robot/random.h"
#include "proto/files/drawn.h"

namespace pastern::stub {
namespace {

template <class T, class U>
void take(bool present, const T& found, U& figure) {
  if (present) figure = found;
}

void take_xyz(bool present, const v1::Xyz& found, std::array<double, 3>& figure) {
  if (present) figure = {found.x(), found.y(), found.z()};
}

void take_wear(const v1::Scenario& scenario, const Model& model, Site& site) {
  for (const auto& wear : scenario.wear()) {
    const int index = model.joint_index(wear.joint());
    if (index < 0) continue;
    const auto j = static_cast<std::size_t>(index);
    take(wear.has_strength(), wear.strength(), site.strength[j]);
    take(wear.has_backlash_rad(), wear.backlash_rad(), site.backlash_rad[j]);
    take(wear.has_zero_offset_rad(), wear.zero_offset_rad(), site.zero_offset_rad[j]);
    take(wear.has_link_mass_ratio(), wear.link_mass_ratio(), site.link_ratio[j]);
  }
}

void take_all_joints(const v1::Scenario& scenario, const Model& model, Site& site) {
  for (std::size_t j = 0; j < static_cast<std::size_t>(model.joint_count()); ++j) {
    take(scenario.has_joint_damping_nm_s_per_rad(), scenario.joint_damping_nm_s_per_rad(),
         site.damping_nm_s_per_rad[j]);
    if (scenario.has_joint_damping_ratio()) site.damping_nm_s_per_rad[j] *= scenario.joint_damping_ratio();
    take(scenario.has_joint_coulomb_nm(), scenario.joint_coulomb_nm(), site.coulomb_nm[j]);
    take(scenario.has_joint_backlash_rad(), scenario.joint_backlash_rad(), site.backlash_rad[j]);
    take(scenario.has_joint_gear_loss(), scenario.joint_gear_loss(), site.gear_loss[j]);
    take(scenario.has_joint_stick_nm(), scenario.joint_stick_nm(), site.stick_nm[j]);
  }
  for (const int shank : model.shanks()) {
    take(scenario.has_shank_mass_ratio(), scenario.shank_mass_ratio(),
         site.link_ratio[static_cast<std::size_t>(shank)]);
  }
}

constexpr double kFarAcross = 1e3;  // m: a patch as wide as the lane

void take_ground(const v1::Scenario& scenario, GroundShape& ground) {
  take(scenario.has_ground_wave_height_m(), scenario.ground_wave_height_m(), ground.wave_height_m);
  take(scenario.has_ground_wave_length_m(), scenario.ground_wave_length_m(), ground.wave_length_m);
  take(scenario.has_friction_stick_ratio(), scenario.friction_stick_ratio(), ground.stick_ratio);
  take(scenario.has_friction_fall(), scenario.friction_fall(), ground.friction_fall);
  take(scenario.has_friction_stick_speed_m_per_s(), scenario.friction_stick_speed_m_per_s(),
       ground.stick_speed_m_per_s);
  take(scenario.has_ground_damping_rise_s_per_m(), scenario.ground_damping_rise_s_per_m(),
       ground.damping_rise_s_per_m);
  for (const auto& step : scenario.ground_steps()) {
    if (ground.step_count == kMaxGroundSteps) break;
    ground.step[static_cast<std::size_t>(ground.step_count++)] = {step.at_m(), step.height_m()};
  }
  for (const auto& patch : scenario.ground_patches()) {
    if (ground.patch_count == kMaxGroundPatches) break;
    ground.patch[static_cast<std::size_t>(ground.patch_count++)] = {
        patch.from_m(), patch.to_m(), patch.has_right_m() ? patch.right_m() : -kFarAcross,
        patch.has_left_m() ? patch.left_m() : kFarAcross, patch.friction()};
  }
}

void take_faults(const v1::Scenario& scenario, const Model& model, Site& site) {
  for (const auto& fault : scenario.faults()) {
    if (site.fault_count == kMaxFaults) break;
    site.fault[static_cast<std::size_t>(site.fault_count++)] = {
        fault.kind(), model.joint_index(fault.joint()), fault.begins_s(), fault.begins_s() + fault.lasts_s(),
        fault.size()};
  }
}

/// Names the random numbers of one range.
struct Draw {
  std::uint64_t seed;
  int range;
  /// `part` 0: whether, and which joint; 1 + j: the number (of joint j).
  [[nodiscard]] Words words(std::uint32_t part) const {
    return random_words(seed, static_cast<std::uint64_t>(range), 0, Chance::site, part);
  }
};

void draw_number(const v1::Drawn& drawn, const Model& model, const Draw& draw, v1::Scenario& site) {
  const auto number = [&](std::uint32_t joint) {
    return drawn.low() + (drawn.high() - drawn.low()) * uniform_of(draw.words(1 + joint)[0]);
  };
  const Words first = draw.words(0);
  if (drawn.has_share() && uniform_of(first[0]) >= drawn.share()) return;
  if (!files::is_wear(drawn.field())) return files::set_number(site, drawn.field(), "", number(0));
  const auto joints = static_cast<std::uint32_t>(model.joint_count());
  const auto one = static_cast<std::uint32_t>(uniform_of(first[1]) * joints);
  for (std::uint32_t j = 0; j < joints; ++j) {
    const std::string& name = model.joint_names()[j];
    const bool meant = drawn.joint() == files::kEachJoint || drawn.joint() == name ||
                       (drawn.joint() == files::kOneJoint && j == one);
    if (meant) files::set_number(site, drawn.field(), name, number(j));
  }
}

}  // namespace

Site nominal_site(const Model& model) {
  Site site;
  for (std::size_t j = 0; j < static_cast<std::size_t>(model.joint_count()); ++j) {
    site.strength[j] = 1;
    site.damping_nm_s_per_rad[j] = model.damping()[j];
    site.coulomb_nm[j] = model.coulomb()[j];
    site.gear_loss[j] = model.gear_loss()[j];
    site.stick_nm[j] = model.stick()[j];
    site.link_ratio[j] = 1;
  }
  return site;
}

v1::Scenario drawn_scenario(const v1::Scenario& scenario, const Model& model, std::uint64_t seed) {
  v1::Scenario site = scenario;
  site.clear_drawn();
  for (int i = 0; i < scenario.drawn_size(); ++i) draw_number(scenario.drawn(i), model, Draw{seed, i}, site);
  return site;
}

Site site_of(const v1::Scenario& ranges, const Model& model, std::uint64_t seed) {
  const v1::Scenario scenario = drawn_scenario(ranges, model, seed);
  Site site = nominal_site(model);
  take(scenario.has_load_kg(), scenario.load_kg(), site.load_kg);
  take_xyz(scenario.has_load_at_m(), scenario.load_at_m(), site.load_at_m);
  take(scenario.has_load_hangs_m(), scenario.load_hangs_m(), site.load_hangs_m);
  take(scenario.has_load_swing_damping(), scenario.load_swing_damping(), site.load_swing_damping);
  take(scenario.has_pack_voltage_ratio(), scenario.pack_voltage_ratio(), site.pack_voltage_ratio);
  take(scenario.has_pack_resistance_ratio(), scenario.pack_resistance_ratio(), site.pack_resistance_ratio);
  take(scenario.has_friction(), scenario.friction(), site.friction);
  take(scenario.has_slope_rad(), scenario.slope_rad(), site.slope_rad);
  take(scenario.has_command_delay_s(), scenario.command_delay_s(), site.command_delay_s);
  take(scenario.has_command_jitter_s(), scenario.command_jitter_s(), site.command_jitter_s);
  take(scenario.has_sensor_delay_s(), scenario.sensor_delay_s(), site.sensor_delay_s);
  take(scenario.has_imu_delay_s(), scenario.imu_delay_s(), site.imu_delay_s);
  take(scenario.has_frames_late(), scenario.frames_late(), site.frames_late);
  take(scenario.has_frames_late_s(), scenario.frames_late_s(), site.frames_late_s);
  take(scenario.has_frames_repeated(), scenario.frames_repeated(), site.frames_repeated);
  take(scenario.has_ground_stiffness_n_per_m(), scenario.ground_stiffness_n_per_m(),
       site.ground_stiffness_n_per_m);
  take(scenario.has_ground_damping_n_s_per_m(), scenario.ground_damping_n_s_per_m(),
       site.ground_damping_n_s_per_m);
  take_ground(scenario, site.ground);
  take(scenario.has_push_m_per_s(), scenario.push_m_per_s(), site.push_m_per_s);
  take(scenario.has_start_scatter_rad(), scenario.start_scatter_rad(), site.start_scatter_rad);
  take(scenario.has_ambient_c(), scenario.ambient_c(), site.ambient_c);
  site.pack_c = scenario.has_pack_c() ? scenario.pack_c() : site.ambient_c;
  take(scenario.has_trunk_inertia_ratio(), scenario.trunk_inertia_ratio(), site.trunk_inertia_ratio);
  site.winding_start_c = scenario.has_ambient_c() ? scenario.ambient_c() : site.winding_start_c;
  take(scenario.has_winding_start_c(), scenario.winding_start_c(), site.winding_start_c);
  take_xyz(scenario.has_imu_tilt_rad(), scenario.imu_tilt_rad(), site.imu_tilt_rad);
  take(scenario.has_position_source(), scenario.position_source(), site.position_source);
  take(scenario.has_sensor_noise_ratio(), scenario.sensor_noise_ratio(), site.sensor_noise_ratio);
  take_all_joints(scenario, model, site);
  take_wear(scenario, model, site);
  take_faults(scenario, model, site);
  return site;
}

}  // namespace pastern::stub
