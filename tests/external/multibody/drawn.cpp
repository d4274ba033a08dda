#include "tests/external/multibody/drawn.h"

#include <array>
#include <cmath>
#include <stdexcept>

#include "proto/files/robot_file.h"

namespace pastern::multibody {
namespace {

void set(v1::Xyz& a, double x, double y, double z) {
  a.set_x(x);
  a.set_y(y);
  a.set_z(z);
}

void somewhere(Lot& lot, v1::Xyz& a, double size) {
  set(a, lot.between(-size, size), lot.between(-size, size), lot.between(-size, size));
}

/// Inertia of six equal point masses about their centre: possible by construction. Not `skewed`: each pair
/// lies on an axis.
void draw_link(Lot& lot, v1::Link& link, double mass, double size, bool skewed) {
  link.set_mass_kg(mass);
  somewhere(lot, *link.mutable_centre_of_mass_m(), size / 2);
  double xx = 0, yy = 0, zz = 0, xy = 0, xz = 0, yz = 0;  // second moments
  for (int pair = 0; pair < 3; ++pair) {
    std::array<double, 3> r{};
    for (int k = 0; k < 3; ++k) {
      if (skewed || k == pair)
        r[static_cast<std::size_t>(k)] = lot.between(0.2, 1) * size * (lot.chance(0.5) ? 1 : -1);
    }
    const double m = mass / 3;
    xx += m * r[0] * r[0];
    yy += m * r[1] * r[1];
    zz += m * r[2] * r[2];
    xy += m * r[0] * r[1];
    xz += m * r[0] * r[2];
    yz += m * r[1] * r[2];
  }
  auto& inertia = *link.mutable_inertia();
  inertia.set_xx(yy + zz);
  inertia.set_yy(xx + zz);
  inertia.set_zz(xx + yy);
  inertia.set_xy(-xy);
  inertia.set_xz(-xz);
  inertia.set_yz(-yz);
}

/// Along x, y, z or against one of them, or any direction.
void draw_axis(Lot& lot, int kind, v1::Xyz& axis) {
  const double sign = lot.chance(0.3) ? -1 : 1;
  if (kind < 3) {
    set(axis, kind == 0 ? sign : 0, kind == 1 ? sign : 0, kind == 2 ? sign : 0);
    return;
  }
  double x = 0, y = 0, z = 0, length = 0;
  do {
    x = lot.between(-1, 1);
    y = lot.between(-1, 1);
    z = lot.between(-1, 1);
    length = std::sqrt(x * x + y * y + z * z);
  } while (length < 0.1 || length > 1);
  set(axis, x / length, y / length, z / length);
}

/// How a limb is made: one entry a joint.
struct Limb {
  int joints{1};
  std::array<int, 4> axis{};  ///< 3: any
  std::array<bool, 4> skewed{};
};

Limb draw_limb(Lot& lot, int least, int most) {
  Limb limb;
  limb.joints = lot.whole(least, most);
  for (auto& axis : limb.axis) axis = lot.whole(0, 3);
  for (auto& skewed : limb.skewed) skewed = lot.chance(0.5);
  return limb;
}

class Growth {
 public:
  Growth(Lot& lot, const Kind& kind, const v1::Joint& pattern, v1::Robot& robot)
      : lot_(lot), kind_(kind), pattern_(pattern), robot_(robot), spare_(32 - kind.legs * kind.most) {}

  void limb(const Limb& limb, int number) {
    const std::string name = "leg" + std::to_string(number) + "_";
    for (int i = 0; i < limb.joints; ++i) {
      const auto k = static_cast<std::size_t>(i);
      joint(name + std::to_string(i), i > 0 ? name + std::to_string(i - 1) : "", limb.axis[k],
            limb.skewed[k]);
      if (spare_ > 0 && lot_.chance(kind_.branching)) {
        joint(name + "side" + std::to_string(i), name + std::to_string(i), lot_.whole(0, 3), true);
        --spare_;
      }
    }
    v1::Leg& leg = *robot_.add_legs();
    leg.set_name("leg" + std::to_string(number));
    leg.set_knee(name + std::to_string(limb.joints - 1));
    somewhere(lot_, *leg.mutable_foot_m(), 0.2);
    leg.set_foot_radius_m(0.02);
  }

 private:
  void joint(const std::string& name, const std::string& parent, int axis, bool skewed) {
    v1::Joint& joint = *robot_.add_joints();
    joint = pattern_;
    joint.set_name(name);
    joint.clear_parent();
    if (!parent.empty()) joint.set_parent(parent);
    const bool slides = lot_.chance(kind_.sliding);
    joint.set_kind(slides ? v1::Joint::PRISMATIC : v1::Joint::HINGE);
    draw_axis(lot_, axis, *joint.mutable_axis());
    somewhere(lot_, *joint.mutable_origin_m(), parent.empty() ? 0.3 : 0.25);
    draw_link(lot_, *joint.mutable_link(), lot_.between(0.2, 2), lot_.between(0.05, 0.15), skewed);
    joint.set_angle_min_rad(slides ? -0.3 : -3);
    joint.set_angle_max_rad(slides ? 0.3 : 3);
    joint.mutable_drive()->set_rotor_inertia_kg_m2(lot_.between(0, 0.03));
    joint.mutable_drive()->set_damping_nm_s_per_rad(lot_.between(0.02, 0.9));
    joint.mutable_drive()->set_coulomb_nm(lot_.between(0, 1.1));
  }

  Lot& lot_;
  const Kind& kind_;
  const v1::Joint& pattern_;
  v1::Robot& robot_;
  int spare_;
};

}  // namespace

v1::Robot shipped(const std::string& name) {
  files::Defects defects;
  const auto file =
      files::read_robot(PASTERN_SOURCE_DIR "/hal_stub/robots/" + name + ".robot.txtpb", defects);
  if (!file) throw std::runtime_error(files::lines(defects));
  return file->robot();
}

v1::Robot drawn_robot(Lot& lot, const Kind& kind) {
  v1::Robot robot = shipped("dunlin12");  // drives, pack and watches of an ordinary robot
  const v1::Joint pattern = robot.joints(0);
  robot.set_name("drawn");
  robot.clear_joints();
  robot.clear_legs();
  draw_link(lot, *robot.mutable_trunk()->mutable_link(), lot.between(2, 20), lot.between(0.1, 0.3),
            lot.chance(0.5));
  const bool alike = lot.chance(0.5);
  Limb limb = draw_limb(lot, kind.least, kind.most);
  Growth growth(lot, kind, pattern, robot);
  for (int l = 0; l < kind.legs; ++l) {
    if (!alike && l > 0) limb = draw_limb(lot, kind.least, kind.most);
    growth.limb(limb, l);
  }
  return robot;
}

void unlimit(v1::Robot& robot) {
  for (auto& joint : *robot.mutable_joints()) {
    joint.mutable_drive()->set_peak_torque_nm(1e9);
    joint.mutable_drive()->set_no_load_speed_rad_per_s(1e9);
  }
}

Motion drawn_motion(Lot& lot, const v1::Robot& robot) {
  Motion motion;
  double square = 0;
  do {  // uniform over rotations: a direction in four dimensions
    square = 0;
    for (double& part : motion.attitude) {
      part = lot.between(-1, 1);
      square += part * part;
    }
  } while (square < 0.01 || square > 1);
  for (double& part : motion.attitude) part /= std::sqrt(square);
  motion.position = {lot.between(-2, 2), lot.between(-2, 2), lot.between(5, 7)};
  for (double& v : motion.velocity) v = lot.between(-2, 2);
  for (double& w : motion.rate) w = lot.between(-4, 4);
  for (const auto& joint : robot.joints()) {
    const double room = 1e-3 * (joint.angle_max_rad() - joint.angle_min_rad());
    motion.angle.push_back(lot.between(joint.angle_min_rad() + room, joint.angle_max_rad() - room));
    motion.speed.push_back(lot.between(-10, 10));
  }
  return motion;
}

}  // namespace pastern::multibody
