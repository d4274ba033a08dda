// Invented numbers of the right size.
#include "tests/proto/fixture.h"

#include <google/protobuf/text_format.h>

#include <cstdio>
#include <cstdlib>

namespace pastern::fixture {
namespace {

void set(v1::Xyz& xyz, double x, double y, double z) {
  xyz.set_x(x);
  xyz.set_y(y);
  xyz.set_z(z);
}

void set_link(v1::Link& link, double mass) {
  link.set_mass_kg(mass);
  set(*link.mutable_centre_of_mass_m(), 0.01, 0, -0.05);
  v1::Inertia& inertia = *link.mutable_inertia();
  inertia.set_xx(0.010 * mass);
  inertia.set_yy(0.012 * mass);
  inertia.set_zz(0.009 * mass);
  inertia.set_xy(0.0001 * mass);
  inertia.set_xz(0.0002 * mass);
  inertia.set_yz(-0.0001 * mass);
}

void set_drive(v1::Drive& drive) {
  drive.set_peak_torque_nm(30);
  drive.set_rated_torque_nm(12);
  drive.set_no_load_speed_rad_per_s(18);
  drive.set_rotor_inertia_kg_m2(0.015);
  drive.set_damping_nm_s_per_rad(0.05);
  drive.set_coulomb_nm(0.2);
  drive.set_torque_per_amp_nm(0.9);
  drive.set_winding_resistance_ohm(0.3);
  drive.set_winding_capacity_j_per_k(60);
  drive.set_housing_capacity_j_per_k(400);
  drive.set_winding_to_housing_k_per_w(0.4);
  drive.set_housing_to_air_k_per_w(1.2);
  drive.set_gear_ratio(9);
  drive.set_gear_loss(0.04);
  drive.set_stick_nm(0.1);
  drive.set_current_limit_a(32);
  drive.set_derate_warm_c(90);
  drive.set_derate_hot_c(130);
}

void set_guard(v1::JointGuard& guard) {
  guard.set_peak_torque_nm(28);
  guard.set_slew_nm_per_s(8000);
  guard.set_trip_torque_nm(40);
  guard.set_trip_torque_hold_s(0.05);
  guard.set_soft_edge_rad(0.05);
  guard.set_speed_max_rad_per_s(25);
  guard.set_soft_speed_rad_per_s(20);
  guard.set_winding_warm_c(80);
  guard.set_winding_max_c(120);
  guard.set_thermal_tau_s(300);
  guard.set_damping_nm_s_per_rad(3);
}

struct Angles {
  double low, high, stance, lying;
};

v1::Joint& add_joint(v1::Robot& robot, const std::string& name, const std::string& parent,
                     const Angles& angles) {
  v1::Joint& joint = *robot.add_joints();
  joint.set_name(name);
  joint.set_parent(parent);
  joint.set_kind(v1::Joint::HINGE);
  set(*joint.mutable_axis(), 0, 1, 0);
  set(*joint.mutable_origin_m(), 0, 0, -0.22);
  set_link(*joint.mutable_link(), 0.8);
  joint.set_angle_min_rad(angles.low);
  joint.set_angle_max_rad(angles.high);
  joint.set_stance_rad(angles.stance);
  joint.set_lying_rad(angles.lying);
  joint.set_stiffness_nm_per_rad(100);
  joint.set_damping_nm_s_per_rad(2.5);
  set_drive(*joint.mutable_drive());
  set_guard(*joint.mutable_guard());
  return joint;
}

void add_leg(v1::Robot& robot, const std::string& name, double x, double y, bool abducts) {
  v1::Leg& leg = *robot.add_legs();
  leg.set_name(name);
  if (abducts) {
    leg.set_abduction(name + "_abduction");
    v1::Joint& joint = add_joint(robot, leg.abduction(), "", {-0.6, 0.6, 0, 0.1});
    set(*joint.mutable_axis(), 1, 0, 0);
    set(*joint.mutable_origin_m(), x, y, 0);
    set(*joint.mutable_tip_m(), 0, 0, -0.06);
    joint.set_tip_radius_m(0.01);
  }
  leg.set_hip(name + "_hip");
  leg.set_knee(name + "_knee");
  v1::Joint& hip = add_joint(robot, leg.hip(), leg.abduction(), {-1, 2.5, 0.75, 1.3});
  if (abducts) {
    set(*hip.mutable_origin_m(), 0, y, 0);
  } else {
    set(*hip.mutable_origin_m(), x, 2 * y, 0);
  }
  add_joint(robot, leg.knee(), leg.hip(), {-2.7, -0.3, -1.5, -2.4});
  set(*leg.mutable_foot_m(), 0, 0, -0.22);
  leg.set_foot_radius_m(0.02);
}

void set_sensors(v1::Sensors& sensors) {
  sensors.set_encoder_step_rad(0.0004);
  sensors.set_angle_noise_rad(0.0005);
  sensors.set_speed_noise_rad_per_s(0.05);
  sensors.set_torque_noise_nm(0.2);
  sensors.set_rate_noise_rad_per_s(0.01);
  sensors.set_rate_bias_rad_per_s(0.005);
  sensors.set_acceleration_noise_m_per_s2(0.1);
  sensors.set_rate_range_rad_per_s(17);
  sensors.set_acceleration_range_m_per_s2(80);
}

void set_guard(v1::Guard& guard) {
  guard.set_tilt_rad(0.6);
  guard.set_tilt_hold_s(0.05);
  guard.set_tilt_at_once_rad(0.9);
  guard.set_tilt_filter_s(0.5);
  guard.set_body_rate_rad_per_s(8);
  guard.set_body_rate_hold_s(0.05);
  guard.set_base_low_m(0.15);
  guard.set_base_low_hold_s(0.05);
  guard.set_pack_low_v(36);
  guard.set_pack_floor_v(40);
  guard.set_pack_hold_s(0.2);
  guard.set_pack_current_max_a(60);
  guard.set_frame_stale_s(0.005);
  guard.set_frame_frozen_ticks(20);
  guard.set_frame_jump_rad(0.2);
  guard.set_overrun_s(0.005);
  guard.set_damp_s(0.3);
  guard.set_lower_s(1.0);
  guard.set_default_stop(v1::RAMP_DOWN);
  v1::Guard::Stop& stop = *guard.add_stops();
  stop.set_cause("operator_halt");
  stop.set_stop(v1::TORQUE_OFF);
  guard.set_drive_timeout_s(0.02);
}

}  // namespace

v1::Robot robot() {
  v1::Robot robot;
  robot.set_name("fixture10");
  robot.set_about("Invented for tests.\nTwo lines.");
  robot.set_cycle_hz(1000);
  set_link(*robot.mutable_trunk()->mutable_link(), 8);
  set(*robot.mutable_trunk()->mutable_size_m(), 0.5, 0.24, 0.12);
  add_leg(robot, "front_left", 0.2, 0.06, true);
  add_leg(robot, "front_right", 0.2, -0.06, true);
  add_leg(robot, "rear_left", -0.2, 0.06, false);
  add_leg(robot, "rear_right", -0.2, -0.06, false);
  v1::Pack& pack = *robot.mutable_pack();
  pack.set_nominal_voltage_v(48);
  pack.set_capacity_ah(8);
  pack.set_resistance_ohm(0.08);
  pack.set_idle_power_w(40);
  pack.set_cells(13);
  pack.set_current_limit_a(60);
  pack.set_resistance_cold_ratio(4);
  set_sensors(*robot.mutable_sensors());
  set_guard(*robot.mutable_guard());
  robot.mutable_lane()->set_half_width_m(1.5);
  robot.mutable_lane()->set_length_m(12);
  v1::ReturnWeights& weights = *robot.mutable_return_weights();
  weights.set_speed_cap_m_per_s(0.8);
  weights.set_energy_per_j(0.001);
  weights.set_drift_per_m_s(0.4);
  weights.set_turn_per_rad_s(0.1);
  weights.set_fall(1);
  weights.set_fall_tilt_rad(0.6);
  robot.set_rise_s(2);
  robot.set_settle_s(1);
  return robot;
}

v1::Scenario scenario() {
  v1::Scenario scenario;
  scenario.set_name("every_field");
  scenario.set_about("Invented for tests.");
  scenario.set_load_kg(2);
  set(*scenario.mutable_load_at_m(), 0.02, 0.05, 0.1);
  scenario.set_pack_voltage_ratio(0.9);
  scenario.set_pack_resistance_ratio(1.5);
  scenario.set_joint_damping_ratio(2);
  scenario.set_joint_coulomb_nm(0.3);
  scenario.set_friction(0.6);
  scenario.set_slope_rad(0.05);
  scenario.set_command_delay_s(0.01);
  scenario.set_command_jitter_s(0.002);
  scenario.set_sensor_delay_s(0.004);
  scenario.set_ground_stiffness_n_per_m(24000);
  scenario.set_ground_damping_n_s_per_m(400);
  scenario.set_push_m_per_s(0.2);
  scenario.set_start_scatter_rad(0.03);
  scenario.set_ambient_c(-18);
  scenario.set_winding_start_c(10);
  set(*scenario.mutable_imu_tilt_rad(), 0.01, -0.01, 0);
  scenario.set_position_source(true);
  scenario.set_sensor_noise_ratio(1);
  scenario.set_ground_wave_height_m(0.012);
  scenario.set_ground_wave_length_m(0.7);
  scenario.add_ground_steps()->set_at_m(2);
  scenario.mutable_ground_steps(0)->set_height_m(0.02);
  v1::GroundPatch& patch = *scenario.add_ground_patches();
  patch.set_from_m(1);
  patch.set_to_m(3);
  patch.set_right_m(-1);
  patch.set_left_m(1);
  patch.set_friction(0.3);
  scenario.set_friction_stick_ratio(1.2);
  scenario.set_friction_fall(0.15);
  scenario.set_friction_stick_speed_m_per_s(0.04);
  scenario.set_ground_damping_rise_s_per_m(0.5);
  scenario.set_load_hangs_m(0.2);
  scenario.set_load_swing_damping(0.05);
  scenario.set_joint_backlash_rad(0.006);
  scenario.set_joint_gear_loss(0.06);
  scenario.set_joint_stick_nm(0.2);
  scenario.set_shank_mass_ratio(1.05);
  scenario.set_trunk_inertia_ratio(1.15);
  scenario.set_pack_c(-5);
  scenario.set_imu_delay_s(0.006);
  scenario.set_frames_late(0.02);
  scenario.set_frames_late_s(0.002);
  scenario.set_frames_repeated(0.01);
  v1::JointWear& wear = *scenario.add_wear();
  wear.set_joint("rear_left_knee");
  wear.set_strength(0.6);
  wear.set_backlash_rad(0.01);
  wear.set_zero_offset_rad(0.02);
  wear.set_link_mass_ratio(1.1);
  v1::Drawn& drawn = *scenario.add_drawn();
  drawn.set_field("strength");
  drawn.set_joint("front_left_hip");
  drawn.set_low(0.8);
  drawn.set_high(1);
  drawn.set_share(0.5);
  v1::Fault& fault = *scenario.add_faults();
  fault.set_kind(v1::Fault::ANGLE_JUMP);
  fault.set_joint("front_left_hip");
  fault.set_begins_s(2);
  fault.set_lasts_s(0.5);
  fault.set_size(0.3);
  return scenario;
}

v1::Plan plan() {
  v1::Plan plan;
  plan.set_name("every_field");
  plan.mutable_adaptation()->set_kind(v1::Adaptation::ES_GRADIENT);
  plan.mutable_adaptation()->set_perturbation_scale(0.05);
  plan.mutable_adaptation()->set_batch(5);
  plan.mutable_adaptation()->set_step(0.02);
  plan.mutable_adaptation()->set_trust_region(0.5);
  plan.set_seed(7);
  plan.set_walk_s(5);
  plan.set_baseline_walks(5);
  plan.set_search_walks(50);
  plan.set_confirmation_pairs(8);
  plan.set_confirmation_level(0.05);
  plan.set_max_falls(5);
  plan.set_max_minutes(60);
  plan.set_max_void_repeats(3);
  plan.set_go_by(v1::Plan::AUTO);
  return plan;
}

v1::Policy policy() {
  v1::Policy policy;
  policy.set_format(1);
  policy.set_name("fixture");
  policy.set_robot("fixture10");
  policy.set_scalar(v1::Policy::DOUBLE);
  policy.set_rate_hz(50);
  policy.set_gait_hz(2.5);
  for (const auto kind : {v1::Channel::ONE, v1::Channel::ROLL, v1::Channel::JOINT_OFFSET,
                          v1::Channel::PHASE_SIN, v1::Channel::PHASE_COS}) {
    v1::Channel& channel = *policy.add_channels();
    channel.set_kind(kind);
    channel.set_scale(1.5);
    if (kind == v1::Channel::JOINT_OFFSET) channel.set_joint("front_left_hip");
  }
  v1::Layer& hidden = *policy.add_layers();
  hidden.set_inputs(5);
  hidden.set_outputs(3);
  hidden.set_activation(v1::Layer::TANH);
  hidden.set_has_bias(true);
  v1::Layer& last = *policy.add_layers();
  last.set_inputs(3);
  last.set_outputs(10);
  last.set_activation(v1::Layer::IDENTITY);
  const v1::Robot walker = robot();
  for (const v1::Leg& leg : walker.legs()) {
    v1::LegAction& action = *policy.add_legs();
    action.set_leg(leg.name());
    action.set_angle_rad(0.4);
    action.set_length_m(0.05);
    if (!leg.abduction().empty()) action.set_abduction_rad(0.2);
  }
  for (int i = 0; i < 18 + 30; ++i) policy.add_parameters(0.01 * i);
  v1::ParameterGroup& first = *policy.add_groups();
  first.set_name("hidden");
  first.set_count(18);
  first.set_perturbation_scale(0.05);
  v1::ParameterGroup& second = *policy.add_groups();
  second.set_name("last");
  second.set_first(18);
  second.set_count(30);
  second.set_perturbation_scale(0.04);
  policy.mutable_provenance()->set_made_by("train");
  policy.mutable_provenance()->set_seed(1);
  return policy;
}

std::string text(const google::protobuf::Message& message) {
  std::string out;
  google::protobuf::TextFormat::PrintToString(message, &out);
  return out;
}

const files::RobotFile& robot_file() {
  static const files::RobotFile kFile = [] {
    files::Defects defects;
    auto file = files::parse_robot(text(robot()), "fixture.robot.txtpb", defects);
    if (!file) {
      std::fputs(files::lines(defects).c_str(), stderr);
      std::abort();
    }
    return *file;
  }();
  return kFile;
}

}  // namespace pastern::fixture
