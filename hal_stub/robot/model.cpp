// Robot file -> constant figures.
#include "hal_stub/robot/model.h"

#include <algorithm>
#include <cmath>

#include "proto/files/sha256.h"

namespace pastern::stub {
namespace {

Vec3<double> vec(const v1::Xyz& a) { return {a.x(), a.y(), a.z()}; }

LinkFigures<double> link_of(const v1::Link& link) {
  const auto& i = link.inertia();
  LinkFigures<double> made;
  made.mass = link.mass_kg();
  made.centre = vec(link.centre_of_mass_m());
  made.inertia = {i.xx(), i.yy(), i.zz(), i.xy(), i.xz(), i.yz()};
  made.skewed = i.xy() != 0 || i.xz() != 0 || i.yz() != 0;
  return made;
}

JointFigures<double> joint_of(const v1::Joint& joint, int order) {
  JointFigures<double> made;
  made.axis = vec(joint.axis());
  made.origin = vec(joint.origin_m());
  made.angle_min = joint.angle_min_rad();
  made.angle_max = joint.angle_max_rad();
  made.order = order;
  made.link = link_of(joint.link());
  const double along[3] = {made.axis.x, made.axis.y, made.axis.z};
  made.kind = AxisKind::any;
  for (int k = 0; k < 3; ++k) {
    if (std::fabs(std::fabs(along[k]) - 1) < 1e-12) {
      made.kind = static_cast<AxisKind>(k);
      made.sign = along[k] > 0 ? 1 : -1;
    }
  }
  return made;
}

/// Joints from the trunk to `tip`, or empty with a line in `error`.
std::vector<int> chain_to(const v1::Robot& robot, const Model& model, int tip, std::string& error) {
  std::vector<int> chain;
  for (int j = tip; j >= 0; j = model.joint_index(robot.joints(j).parent())) {
    chain.push_back(j);
    if (chain.size() > kMaxChain) {
      error = robot.joints(tip).name() + ": found more than 4 joints from the trunk, expected at most 4";
      return {};
    }
    if (robot.joints(j).parent().empty()) break;
  }
  std::reverse(chain.begin(), chain.end());
  return chain;
}

}  // namespace

int Model::joint_index(const std::string& name) const {
  const auto found = std::find(joint_names_.begin(), joint_names_.end(), name);
  return found == joint_names_.end() ? -1 : static_cast<int>(found - joint_names_.begin());
}

bool Model::take_legs(const v1::Robot& robot, std::string& error) {
  std::vector<int> children(static_cast<std::size_t>(joint_count_), 0);
  for (const auto& joint : robot.joints()) {
    if (joint.kind() != v1::Joint::HINGE) {
      error =
          joint.name() + ".kind: found a sliding joint, expected HINGE (the simulated robot has hinges only)";
      return false;
    }
    const int parent = joint_index(joint.parent());
    if (parent >= 0) ++children[static_cast<std::size_t>(parent)];
  }
  auto& tree = figures_.tree;
  for (int tip = 0; tip < joint_count_; ++tip) {
    if (children[static_cast<std::size_t>(tip)] > 1) {
      error =
          robot.joints(tip).name() + ": found two joints that it carries, expected a chain without branches";
      return false;
    }
    if (children[static_cast<std::size_t>(tip)] == 1) continue;
    if (tree.leg_count == kMaxTreeLegs) {
      error = "joints: found more than 8 limbs, expected at most 8";
      return false;
    }
    const std::vector<int> chain = chain_to(robot, *this, tip, error);
    if (chain.empty()) return false;
    auto& leg = tree.leg[static_cast<std::size_t>(tree.leg_count++)];
    leg.joint_count = static_cast<int>(chain.size());
    for (std::size_t i = 0; i < chain.size(); ++i) leg.joint[i] = joint_of(robot.joints(chain[i]), chain[i]);
    leg.foot =
        leg.joint[chain.size() - 1].link.centre;  // a limb that is no leg touches with its centre of mass
    for (const auto& named : robot.legs()) {
      if (named.knee() != robot.joints(tip).name()) continue;
      leg.foot = vec(named.foot_m());
      leg.foot_radius = named.foot_radius_m();
    }
    leg.knee = chain.size() > 1;
    leg.knee_radius = 0.02;
  }
  return true;
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
}

std::shared_ptr<const Model> Model::make(const v1::Robot& robot, std::string& error) {
  const std::shared_ptr<Model> model(new Model);
  model->joint_count_ = robot.joints_size();
  model->name_ = robot.name();
  for (const auto& joint : robot.joints()) model->joint_names_.push_back(joint.name());
  if (!model->take_legs(robot, error)) return nullptr;
  model->take_drives(robot);
  auto& tree = model->figures_.tree;
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
  model->sensors_ = robot.sensors();
  model->period_s_ = 1 / robot.cycle_hz();
  model->substeps_ = std::max(1, static_cast<int>(std::ceil(model->period_s_ / 0.001 - 1e-9)));
  model->drive_timeout_s_ = robot.guard().drive_timeout_s();
  model->rise_s_ = robot.rise_s() + robot.settle_s();
  model->stance_height_m_ = reach_below(tree, model->stance_.data(), {0, 0, -1});
  std::string bytes;
  robot.SerializeToString(&bytes);
  model->digest_ = files::raw(files::sha256(bytes));
  return model;
}

namespace {

/// Places of a leg's foot and last joint.
void leg_places(const LegFigures<double>& leg, const double* angle, Vec3<double>& foot, Vec3<double>& knee) {
  Rotation<double> axes{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}};
  Vec3<double> place{0, 0, 0};
  for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
    place = place + turn(axes, leg.joint[i].origin);
    axes = turned(axes, leg.joint[i], sin_cos(angle[leg.joint[i].order]));
  }
  knee = place;
  foot = place + turn(axes, leg.foot);
}

/// f(place in trunk axes, radius) for every contact point of the limbs.
template <class F>
void for_points(const Tree<double>& tree, const double* angle, F&& f) {
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    Vec3<double> foot{};
    Vec3<double> knee{};
    leg_places(tree.leg[l], angle, foot, knee);
    f(foot, tree.leg[l].foot_radius);
    if (tree.leg[l].knee) f(knee, tree.leg[l].knee_radius);
  }
}

}  // namespace

Vec3<double> foot_place(const Tree<double>& tree, int leg, const double* angle) {
  Vec3<double> foot{};
  Vec3<double> knee{};
  leg_places(tree.leg[static_cast<std::size_t>(leg)], angle, foot, knee);
  return foot;
}

double reach_below(const Tree<double>& tree, const double* angle, const Vec3<double>& down) {
  double reach = std::fabs(down.x) * tree.half_size.x + std::fabs(down.y) * tree.half_size.y +
                 std::fabs(down.z) * tree.half_size.z;
  for_points(tree, angle, [&](const Vec3<double>& place, double radius) {
    reach = std::max(reach, dot(place, down) + radius);
  });
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
  for_points(tree, angle, lift);
  for (const Vec3<double>& corner : tree.corner) lift(corner, 0);
  return least;
}

}  // namespace pastern::stub
