// What a walk keeps for itself, one entry a lane: its site as lanes of numbers, and where each number of a
// robot on its mark goes.
#pragma once

#include "hal_stub/robot/robot_state.h"
#include "tools/packed/lanes.h"
#include "tools/packed/walk.h"

namespace pastern::packed::PASTERN_LANES_SET {

template <class S>
struct LaneSite {
  stub::PerDrive<S> zero_offset{};
  S angle_noise{}, speed_noise{}, torque_noise{}, rate_noise{};
  stub::Rotation<S> imu_axes{};
  stub::Vec3<S> rate_bias{};
  S roll_error{}, pitch_error{};
  stub::Vec3<S> push{};
  S push_first{}, push_end{};  ///< ticks since placed
  // Yaw, place and speed count from the start's own place and heading, as the estimator's do.
  S cosine{}, sine{}, yaw{}, x{}, y{};
};

template <class S>
[[gnu::always_inline]] inline void put(int lane, double from, S& to) noexcept {
  to.put(lane, static_cast<typename S::Constant>(from));
}
template <class S>
inline void put(int lane, const stub::Vec3<double>& from, stub::Vec3<S>& to) noexcept {
  put(lane, from.x, to.x);
  put(lane, from.y, to.y);
  put(lane, from.z, to.z);
}
template <class S>
inline void put(int lane, const stub::Sym3<double>& from, stub::Sym3<S>& to) noexcept {
  put(lane, from.xx, to.xx);
  put(lane, from.yy, to.yy);
  put(lane, from.zz, to.zz);
  put(lane, from.xy, to.xy);
  put(lane, from.xz, to.xz);
  put(lane, from.yz, to.yz);
}

/// f(number) for each number of a robot that varies, always in the same order; C is lanes or one number.
template <class Tree, class C, class F>
inline void each_number(const Tree& tree, stub::RobotState<C>& state, F&& f) {
  auto& body = state.body;
  for (C* number : {&body.attitude.w, &body.attitude.x, &body.attitude.y, &body.attitude.z, &body.position.x,
                    &body.position.y, &body.position.z, &body.velocity.x, &body.velocity.y, &body.velocity.z,
                    &body.rate.x, &body.rate.y, &body.rate.z}) {
    f(*number);
  }
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      f(body.angle[l][i]);
      f(body.speed[l][i]);
    }
    for (C& grip : body.grip.leg[l]) f(grip);
    for (int p = stub::kPointsPerLeg; p < tree.leg[l].point_count; ++p) {
      f(body.grip.more[l][static_cast<std::size_t>(p - stub::kPointsPerLeg)]);
    }
  }
  for (C& grip : body.grip.corner) f(grip);
  auto& drives = state.drives;
  for (std::size_t j = 0; j < static_cast<std::size_t>(tree.joint_count); ++j) {
    for (auto* number : {&drives.torque, &drives.rotor_angle, &drives.rotor_speed, &drives.winding,
                         &drives.housing, &drives.wound}) {
      f((*number)[j]);
    }
  }
  for (auto* at : {&body.swing.place, &body.swing.velocity}) {
    f(at->x);
    f(at->y);
    f(at->z);
  }
  f(state.pack.share);
  f(state.pack.charge);
  f(state.pack.voltage);
  f(state.pack.current);
}

template <class S>
inline void put(int lane, std::size_t joints, const stub::SiteFigures<double>& from,
                stub::SiteFigures<S>& to) noexcept {
  stub::pair_grounds(to.around.ground, from.around.ground,
                     [lane](S& number, double value) { put(lane, value, number); });
  put(lane, from.around.trunk.mass, to.around.trunk.mass);
  put(lane, from.around.trunk.centre, to.around.trunk.centre);
  put(lane, from.around.trunk.inertia, to.around.trunk.inertia);
  for (std::size_t j = 0; j < joints; ++j) {
    put(lane, from.drives.strength[j], to.drives.strength[j]);
    put(lane, from.drives.damping[j], to.drives.damping[j]);
    put(lane, from.drives.coulomb[j], to.drives.coulomb[j]);
    put(lane, from.drives.half_gap[j], to.drives.half_gap[j]);
    put(lane, from.drives.loss[j], to.drives.loss[j]);
    put(lane, from.drives.stick[j], to.drives.stick[j]);
  }
  // What one lane has costs all of them, and is nothing to those that have it not.
  to.drives.plain = to.drives.plain && from.drives.plain;
  to.around.hangs = to.around.hangs || from.around.hangs;
  auto& trunk = to.around.trunk;
  trunk.weighed = trunk.weighed || from.around.trunk.weighed;
  for (std::size_t l = 0; l < trunk.link_ratio.size(); ++l) {
    for (std::size_t i = 0; i < trunk.link_ratio[l].size(); ++i) {
      put(lane, from.around.trunk.link_ratio[l][i], trunk.link_ratio[l][i]);
    }
  }
  const auto& load = from.around.hanging;
  put(lane, load.at, to.around.hanging.at);
  put(lane, load.length, to.around.hanging.length);
  put(lane, load.stiffness, to.around.hanging.stiffness);
  put(lane, load.along, to.around.hanging.along);
  put(lane, load.across, to.around.hanging.across);
  put(lane, load.inverse_mass, to.around.hanging.inverse_mass);
  put(lane, from.drives.ambient, to.drives.ambient);
  put(lane, from.pack.open_scale, to.pack.open_scale);
  put(lane, from.pack.resistance, to.pack.resistance);
}

template <class S>
inline void put(int lane, std::size_t joints, const OnMark& from, LaneSite<S>& to) noexcept {
  for (std::size_t j = 0; j < joints; ++j) put(lane, from.zero_offset[j], to.zero_offset[j]);
  put(lane, from.angle_noise, to.angle_noise);
  put(lane, from.speed_noise, to.speed_noise);
  put(lane, from.torque_noise, to.torque_noise);
  put(lane, from.rate_noise, to.rate_noise);
  put(lane, from.imu_axes.x, to.imu_axes.x);
  put(lane, from.imu_axes.y, to.imu_axes.y);
  put(lane, from.imu_axes.z, to.imu_axes.z);
  put(lane, from.rate_bias, to.rate_bias);
  put(lane, from.roll_error, to.roll_error);
  put(lane, from.pitch_error, to.pitch_error);
  put(lane, from.push, to.push);
  put(lane, from.push_first, to.push_first);
  put(lane, from.push_end, to.push_end);
}

}  // namespace pastern::packed::PASTERN_LANES_SET
