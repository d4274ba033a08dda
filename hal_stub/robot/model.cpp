// Robot file -> constant figures.
#include "hal_stub/robot/model.h"

#include <algorithm>
#include <cmath>

#include "hal_stub/robot/limbs.h"
#include "proto/files/sha256.h"

namespace pastern::stub {
namespace {

Vec3<double> vec(const v1::Xyz& a) { return {a.x(), a.y(), a.z()}; }

}  // namespace

int Model::joint_index(const std::string& name) const {
  const auto found = std::find(joint_names_.begin(), joint_names_.end(), name);
  return found == joint_names_.end() ? -1 : static_cast<int>(found - joint_names_.begin());
}

void Model::take_drives(const v1::Robot& robot) {
  for (int j = 0; j < joint_count_; ++j) {
    const auto& d = robot.joints(j).drive();
    auto& made = figures_.drive[static_cast<std::size_t>(j)];
    made.peak_torque = d.peak_torque_nm();
    made.no_load_speed = d.no_load_speed_rad_per_s();
    made.rotor_inertia = d.rotor_inertia_kg_m2();
    made.per_amp = d.torque_per_amp_nm();
    made.resistance = d.winding_resistance_ohm();
    made.winding_per_j = 1 / d.winding_capacity_j_per_k();
    made.housing_per_j = 1 / d.housing_capacity_j_per_k();
    made.to_housing = 1 / d.winding_to_housing_k_per_w();
    made.to_air = 1 / d.housing_to_air_k_per_w();
    made.timeout_damping = robot.joints(j).guard().damping_nm_s_per_rad();
    made.most_torque = d.peak_torque_nm();
    if (d.has_current_limit_a()) {
      made.most_torque = std::min(made.most_torque, d.current_limit_a() * d.torque_per_amp_nm());
    }
    if (d.has_derate_hot_c()) {
      made.hot = d.derate_hot_c();
      made.per_derating = 1 / (d.derate_hot_c() - d.derate_warm_c());
    }
    limited_ = limited_ || d.has_current_limit_a() || d.has_derate_hot_c();
    gear_loss_.push_back(d.gear_loss());
    stick_.push_back(d.stick_nm());
    damping_.push_back(d.damping_nm_s_per_rad());
    coulomb_.push_back(d.coulomb_nm());
    stance_.push_back(robot.joints(j).stance_rad());
    hold_stiffness_.push_back(robot.joints(j).stiffness_nm_per_rad());
    hold_damping_.push_back(robot.joints(j).damping_nm_s_per_rad());
    envelope_.push_back(robot.joints(j).guard().peak_torque_nm());
    lying_.push_back(robot.joints(j).lying_rad());
  }
  const auto& p = robot.pack();
  figures_.pack = {p.nominal_voltage_v(), p.capacity_ah() * 3600, p.resistance_ohm(), p.idle_power_w()};
  if (p.has_current_limit_a()) figures_.pack.most_current = p.current_limit_a();
  limited_ = limited_ || p.has_current_limit_a();
  cold_ratio_ = p.has_resistance_cold_ratio() ? p.resistance_cold_ratio() : 1;
}

std::shared_ptr<const Model> Model::make(const v1::Robot& robot, std::string& error, double longest_step_s) {
  const std::shared_ptr<Model> model(new Model);
  model->joint_count_ = robot.joints_size();
  model->name_ = robot.name();
  for (const auto& joint : robot.joints()) model->joint_names_.push_back(joint.name());
  auto& tree = model->figures_.tree;
  if (!take_limbs(robot, tree, error)) return nullptr;
  model->take_drives(robot);
  tree.joint_count = model->joint_count_;
  tree.trunk = link_of(robot.trunk().link());
  const auto size = vec(robot.trunk().size_m());
  tree.half_size = size * 0.5;
  for (std::size_t c = 0; c < kTrunkCorners; ++c) {
    tree.corner[c] = {tree.half_size.x * ((c & 1U) != 0 ? 1 : -1),
                      tree.half_size.y * ((c & 2U) != 0 ? 1 : -1),
                      tree.half_size.z * ((c & 4U) != 0 ? 1 : -1)};
  }
  model->mass_kg_ = robot.trunk().link().mass_kg();
  for (const auto& joint : robot.joints()) model->mass_kg_ += joint.link().mass_kg();
  for (const auto& leg : robot.legs()) model->shanks_.push_back(model->joint_index(leg.knee()));
  model->sensors_ = robot.sensors();
  model->period_s_ = 1 / robot.cycle_hz();
  model->substeps_ = std::max(1, static_cast<int>(std::ceil(model->period_s_ / longest_step_s - 1e-9)));
  model->drive_timeout_s_ = robot.guard().drive_timeout_s();
  model->rise_s_ = robot.rise_s() + robot.settle_s();
  model->stance_height_m_ = reach_below(tree, model->stance_.data(), {0, 0, -1});
  std::string bytes;
  robot.SerializeToString(&bytes);
  model->digest_ = files::raw(files::sha256(bytes));
  return model;
}

Vec3<double> foot_place(const Tree<double>& tree, int leg, const double* angle) {
  Vec3<double> foot{};
  bool first = true;
  for_points(tree.leg[static_cast<std::size_t>(leg)], angle, [&](const Vec3<double>& place, double) {
    if (first) foot = place;
    first = false;
  });
  return foot;
}

double reach_below(const Tree<double>& tree, const double* angle, const Vec3<double>& down) {
  double reach = std::fabs(down.x) * tree.half_size.x + std::fabs(down.y) * tree.half_size.y +
                 std::fabs(down.z) * tree.half_size.z;
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for_points(tree.leg[l], angle, [&](const Vec3<double>& place, double radius) {
      reach = std::max(reach, dot(place, down) + radius);
    });
  }
  return reach;
}

double rest_height(const Tree<double>& tree, const double* angle, const Quat<double>& attitude,
                   const Ground<double>& ground) {
  const Rotation<double> body = rotation_of(attitude);
  const double deep = -10;  // m under the plane: every point is in the ground, and its depth says how far up
  const Vec3<double> position = ground.normal * deep;
  const Below<double> below = below_of(ground, body, position);
  const ShapedFooting<double> on{ground, below, stand_of(ground, body, position), 0.001};
  double least = -1e9;
  const auto lift = [&](const Vec3<double>& place, double radius) {
    const Lie<double> lie = lie_of(on, place, radius);
    least = std::max(least, deep + lie.depth / dot(lie.normal, below.normal));
  };
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for_points(tree.leg[l], angle, lift);
  }
  for (const Vec3<double>& corner : tree.corner) lift(corner, 0);
  return least;
}

}  // namespace pastern::stub
