// Robot file -> limits of the gate. The names of causes in the file are those of safety::name().
#include <cstring>
#include <string>

#include "runtime/session/cycle.h"

namespace pastern::session {
namespace {

safety::JointLimits joint_limits(const v1::Joint& joint) {
  const v1::JointGuard& guard = joint.guard();
  safety::JointLimits limits;
  limits.peak_torque_nm = guard.peak_torque_nm();
  limits.slew_nm_per_s = guard.slew_nm_per_s();
  limits.trip_torque_nm = guard.trip_torque_nm();
  limits.trip_torque_hold_s = guard.trip_torque_hold_s();
  limits.angle_min_rad = joint.angle_min_rad();
  limits.angle_max_rad = joint.angle_max_rad();
  limits.soft_edge_rad = guard.soft_edge_rad();
  limits.speed_max_rad_per_s = guard.speed_max_rad_per_s();
  limits.soft_speed_rad_per_s = guard.soft_speed_rad_per_s();
  limits.winding_warm_c = guard.winding_warm_c();
  limits.winding_max_c = guard.winding_max_c();
  limits.rated_torque_nm = joint.drive().rated_torque_nm();
  limits.thermal_tau_s = guard.thermal_tau_s();
  limits.damping_nm_s_per_rad = guard.damping_nm_s_per_rad();
  return limits;
}

int index_of(const v1::Robot& robot, const std::string& name) {
  for (int j = 0; j < robot.joints_size(); ++j) {
    if (robot.joints(j).name() == name) return j;
  }
  return -1;
}

safety::Vector3<safety::Metre, safety::Body> metres(const v1::Xyz& xyz) {
  return {xyz.x(), xyz.y(), xyz.z()};
}

safety::LegChain leg_chain(const v1::Robot& robot, const v1::Leg& leg) {
  safety::LegChain chain;
  for (const std::string* name : {&leg.abduction(), &leg.hip(), &leg.knee()}) {
    const int joint = name->empty() ? -1 : index_of(robot, *name);
    if (joint < 0) continue;
    const auto i = static_cast<std::size_t>(chain.joint_count++);
    chain.joint[i] = joint;
    chain.origin[i] = metres(robot.joints(joint).origin_m());
    chain.axis[i] = metres(robot.joints(joint).axis());
  }
  chain.foot = metres(leg.foot_m());
  return chain;
}

void set_reactions(const v1::Guard& guard, safety::Limits& limits) {
  const auto reaction_of = [](v1::StopChoice choice) {
    return choice == v1::RAMP_DOWN ? safety::Reaction::ramp_down : safety::Reaction::torque_off;
  };
  limits.reaction.fill(reaction_of(guard.default_stop()));
  for (const v1::Guard::Stop& stop : guard.stops()) {
    for (int c = 1; c < safety::kCauseCount; ++c) {
      if (stop.cause() == safety::name(static_cast<safety::Cause>(c))) {
        limits.reaction[static_cast<std::size_t>(c)] = reaction_of(stop.stop());
      }
    }
  }
}

}  // namespace

safety::Limits limits_of(const v1::Robot& robot) {
  const v1::Guard& guard = robot.guard();
  safety::Limits limits;
  limits.joint_count = robot.joints_size();
  for (int j = 0; j < robot.joints_size(); ++j) {
    limits.joint[static_cast<std::size_t>(j)] = joint_limits(robot.joints(j));
  }
  limits.leg_count = robot.legs_size();
  for (int l = 0; l < robot.legs_size(); ++l) {
    limits.leg[static_cast<std::size_t>(l)] = leg_chain(robot, robot.legs(l));
  }
  limits.tick_s = 1.0 / robot.cycle_hz();
  limits.tilt_rad = guard.tilt_rad();
  limits.tilt_hold_s = guard.tilt_hold_s();
  limits.tilt_at_once_rad = guard.tilt_at_once_rad();
  limits.tilt_filter_s = guard.tilt_filter_s();
  limits.body_rate_rad_per_s = guard.body_rate_rad_per_s();
  limits.body_rate_hold_s = guard.body_rate_hold_s();
  limits.base_low_m = guard.base_low_m();
  limits.base_low_hold_s = guard.base_low_hold_s();
  limits.pack_low_v = guard.pack_low_v();
  limits.pack_floor_v = guard.pack_floor_v();
  limits.pack_hold_s = guard.pack_hold_s();
  limits.pack_current_max_a = guard.pack_current_max_a();
  limits.frame_stale_s = guard.frame_stale_s();
  limits.frame_frozen_ticks = static_cast<int>(guard.frame_frozen_ticks());
  limits.frame_jump_rad = guard.frame_jump_rad();
  limits.rate_range_rad_per_s = robot.sensors().rate_range_rad_per_s();
  limits.acceleration_range_m_per_s2 = robot.sensors().acceleration_range_m_per_s2();
  limits.overrun_s = guard.overrun_s();
  limits.damp_s = guard.damp_s();
  limits.lower_s = guard.lower_s();
  set_reactions(guard, limits);
  return limits;
}

}  // namespace pastern::session
