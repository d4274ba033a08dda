#include "tests/hal_stub/random_robot.h"

#include <google/protobuf/text_format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include "hal_stub/robot/limbs.h"
#include "hal_stub/robot/simulated_robot.h"
#include "hal_stub/robot/start.h"
#include "proto/files/robot_file.h"
#include "tests/hal_stub/bodies.h"

namespace pastern::stub {
namespace {

class Lot {
 public:
  explicit Lot(std::uint64_t seed) : engine_(seed * 0x9E3779B97F4A7C15ULL + 1) {}
  double between(double low, double high) {
    return low + (high - low) * static_cast<double>(engine_() >> 11U) * 0x1p-53;
  }
  int whole(int low, int high) {
    return low + static_cast<int>(engine_() % static_cast<std::uint64_t>(high - low + 1));
  }
  bool chance(double p) { return between(0, 1) < p; }

 private:
  std::mt19937_64 engine_;
};

void set(v1::Xyz& a, double x, double y, double z) {
  a.set_x(x);
  a.set_y(y);
  a.set_z(z);
}

/// A box about its centre, in kg and m.
void box(v1::Link& link, double mass, const V3& centre, const V3& size) {
  link.set_mass_kg(mass);
  set(*link.mutable_centre_of_mass_m(), centre.x, centre.y, centre.z);
  auto& i = *link.mutable_inertia();
  i.set_xx(mass * (size.y * size.y + size.z * size.z) / 12);
  i.set_yy(mass * (size.x * size.x + size.z * size.z) / 12);
  i.set_zz(mass * (size.x * size.x + size.y * size.y) / 12);
}

/// Grows a robot file joint by joint.
class Growth {
 public:
  Growth(std::uint64_t seed, v1::Robot& robot, const v1::Joint& pattern)
      : lot_(seed), robot_(robot), pattern_(pattern) {}

  void grow() {
    const V3 size{lot_.between(0.3, 0.7), lot_.between(0.15, 0.35), lot_.between(0.08, 0.2)};
    set(*robot_.mutable_trunk()->mutable_size_m(), size.x, size.y, size.z);
    box(*robot_.mutable_trunk()->mutable_link(), lot_.between(3, 20),
        {lot_.between(-0.03, 0.03), lot_.between(-0.02, 0.02), lot_.between(-0.02, 0.02)}, size * 0.8);
    const int legs = lot_.whole(2, 6);
    const bool waist = lot_.chance(0.3);
    if (waist) {
      v1::Joint& joint = add("waist", "", {-size.x / 2, 0, 0}, lot_.between(0.8, 3), 0.12);
      across(joint);
    }
    const double thigh = lot_.between(0.14, 0.3);
    const double shank = thigh * lot_.between(0.85, 1.15);
    for (int l = 0; l < legs; ++l) {
      const double along = legs < 3 ? 0 : size.x * (0.5 - (l / 2) / ((legs + 1) / 2 - 1.0 + 1e-9));
      const bool on_waist = waist && l >= legs - 2;
      const V3 at{on_waist ? -lot_.between(0.02, 0.15) : along, (l % 2 == 0 ? 0.5 : -0.5) * size.y, 0};
      leg(l, on_waist ? "waist" : "", at, thigh, shank);
    }
    const int limbs = static_cast<int>((legs < 6 ? lot_.whole(0, 2) : lot_.whole(0, 1)));
    for (int l = 0; l < limbs; ++l) limb("limb" + std::to_string(l), size);
  }

 private:
  v1::Joint& add(const std::string& name, const std::string& parent, const V3& origin, double mass,
                 double length) {
    v1::Joint& joint = *robot_.add_joints();
    joint = pattern_;
    joint.set_name(name);
    joint.clear_parent();
    if (!parent.empty()) joint.set_parent(parent);
    set(*joint.mutable_axis(), 0, 1, 0);
    set(*joint.mutable_origin_m(), origin.x, origin.y, origin.z);
    box(*joint.mutable_link(), mass, {0, 0, -0.4 * length}, {0.04, 0.05, length});
    auto& drive = *joint.mutable_drive();
    drive.set_rotor_inertia_kg_m2(lot_.between(0.004, 0.03));
    drive.set_damping_nm_s_per_rad(lot_.between(0.02, 0.3));
    drive.set_coulomb_nm(lot_.between(0, 0.6));
    joint.set_angle_min_rad(-1.2);
    joint.set_angle_max_rad(1.2);
    joint.set_stance_rad(lot_.between(-0.2, 0.2));
    joint.set_lying_rad(joint.stance_rad());
    return joint;
  }

  /// About any axis.
  void across(v1::Joint& joint) {
    const double a = lot_.between(0, 6.28);
    const double z = lot_.between(-1, 1);
    const double r = std::sqrt(1 - z * z);
    set(*joint.mutable_axis(), r * std::cos(a), r * std::sin(a), z);
  }

  /// Slides along any axis; figures of a slide's size.
  void slide(v1::Joint& joint) {
    joint.set_kind(v1::Joint::PRISMATIC);
    joint.set_angle_min_rad(-0.1);
    joint.set_angle_max_rad(0.15);
    joint.set_stance_rad(lot_.between(-0.02, 0.05));
    joint.set_lying_rad(joint.stance_rad());
    joint.set_stiffness_nm_per_rad(5000);
    joint.set_damping_nm_s_per_rad(200);
    auto& drive = *joint.mutable_drive();
    drive.set_peak_torque_nm(lot_.between(100, 300));
    drive.set_rated_torque_nm(50);
    drive.set_no_load_speed_rad_per_s(lot_.between(0.5, 1.5));
    drive.set_rotor_inertia_kg_m2(lot_.between(0.5, 3));
    drive.set_damping_nm_s_per_rad(lot_.between(5, 30));
    drive.set_coulomb_nm(lot_.between(0, 8));
    drive.set_torque_per_amp_nm(15);
    auto& guard = *joint.mutable_guard();
    guard.set_soft_edge_rad(0.01);
    guard.set_peak_torque_nm(drive.peak_torque_nm());
    guard.set_trip_torque_nm(2 * drive.peak_torque_nm());
  }

  void leg(int number, const std::string& parent, const V3& at, double thigh, double shank) {
    const std::string name = "leg" + std::to_string(number);
    v1::Leg& leg = *robot_.add_legs();
    leg.set_name(name);
    std::string before = parent;
    V3 origin = at;
    if (lot_.chance(0.6)) {
      v1::Joint& joint = add(name + "_abduction", before, origin, lot_.between(0.2, 0.8), 0.05);
      set(*joint.mutable_axis(), 1, 0, 0);
      before = joint.name();
      leg.set_abduction(before);
      origin = {0, at.y > 0 ? 0.05 : -0.05, 0};
    }
    v1::Joint& hip = add(name + "_hip", before, origin, lot_.between(0.3, 1.4), thigh);
    hip.set_angle_min_rad(-1.2);
    hip.set_angle_max_rad(2.6);
    hip.set_stance_rad(lot_.between(0.5, 0.9));
    hip.set_lying_rad(1.4);
    leg.set_hip(hip.name());
    const double bend = -hip.stance_rad() - lot_.between(0.5, 0.9);
    v1::Joint& knee = add(name + "_knee", leg.hip(), {0, 0, -thigh}, lot_.between(0.1, 0.5), shank);
    knee.set_angle_min_rad(-2.9);
    knee.set_angle_max_rad(-0.3);
    knee.set_stance_rad(bend);
    knee.set_lying_rad(-2.7);
    leg.set_knee(knee.name());
    set(*leg.mutable_foot_m(), 0, 0, -shank);
    leg.set_foot_radius_m(lot_.between(0, 0.03));
  }

  void limb(const std::string& name, const V3& size) {
    const int joints = lot_.whole(1, 4);
    std::string before;
    V3 origin{lot_.chance(0.5) ? size.x / 2 : -size.x / 2, lot_.between(-0.05, 0.05),
              lot_.between(0, size.z / 2)};
    for (int i = 0; i < joints; ++i) {
      const std::string own = name + "_" + std::to_string(i);
      piece(own, before, origin);
      if (lot_.chance(0.3)) piece(own + "_side", own, {lot_.between(-0.05, 0.05), 0.03, -0.05});
      before = own;
      origin = {lot_.between(-0.05, 0.05), lot_.between(-0.05, 0.05), -lot_.between(0.05, 0.2)};
    }
  }

  void piece(const std::string& name, const std::string& parent, const V3& origin) {
    v1::Joint& joint = add(name, parent, origin, lot_.between(0.15, 0.9), lot_.between(0.06, 0.2));
    across(joint);
    if (lot_.chance(0.3)) slide(joint);
    if (lot_.chance(0.3)) {
      set(*joint.mutable_tip_m(), 0, 0, -lot_.between(0.05, 0.15));
      joint.set_tip_radius_m(0.015);
    }
  }

  Lot lot_;
  v1::Robot& robot_;
  const v1::Joint& pattern_;
};

/// A ground by lot: half of them plain and level.
Site random_site(Lot& lot, const Model& model) {
  Site site = nominal_site(model);
  site.friction = lot.between(0.2, 1.0);
  site.ground_stiffness_n_per_m = lot.between(15000, 40000);
  if (lot.chance(0.5)) return site;
  site.slope_rad = lot.between(-0.1, 0.1);
  site.ground.wave_height_m = lot.between(0, 0.03);
  site.ground.wave_length_m = lot.between(0.4, 1.5);
  site.ground.step_count = lot.whole(0, 3);
  for (std::size_t i = 0; i < 3; ++i) site.ground.step[i] = {lot.between(-0.5, 1), lot.between(0.01, 0.06)};
  site.ground.stick_ratio = lot.between(1, 1.4);
  site.ground.damping_rise_s_per_m = lot.between(0, 1);
  return site;
}

/// Kinetic energy with the rotors', potential energy and that of end stops, and the fastest that anything
/// turns.
struct Energy {
  double kinetic;
  double stored;
  double met;   ///< in end stops that were met in this step, and so were pressed for nothing
  double rate;  ///< rad/s, the sum of trunk and the fastest line of joints: an upper bound of any link's
};

Energy energy_of(const Figures<double>& figures, const BodyState<double>& body, double step_s) {
  const Totals sum = totals(figures.tree, body);
  Energy energy{sum.kinetic, sum.potential, 0, 0};
  const double trunk = std::sqrt(dot(body.rate, body.rate));
  double fastest = 0;
  for (std::size_t l = 0; l < static_cast<std::size_t>(figures.tree.leg_count); ++l) {
    double line = 0;
    for (std::size_t i = 0; i < static_cast<std::size_t>(figures.tree.leg[l].joint_count); ++i) {
      const auto& joint = figures.tree.leg[l].joint[i];
      const double v = body.speed[l][i];
      energy.kinetic += 0.5 * figures.drive[static_cast<std::size_t>(joint.order)].rotor_inertia * v * v;
      if (!joint.slides) line += std::fabs(v);
      const double q = body.angle[l][i];
      const double over = std::max(q - joint.angle_max, 0.0) + std::min(q - joint.angle_min, 0.0);
      const auto& tree = figures.tree;
      const double stop = 0.5 * (joint.slides ? tree.slide_stiffness : tree.stop_stiffness) * over * over;
      energy.stored += stop;
      // Met in this step: it was not pressed before.
      if (std::fabs(over) <= std::fabs(v) * step_s) energy.met += stop;
    }
    fastest = std::max(fastest, line);
  }
  energy.rate = trunk + fastest;
  return energy;
}

/// Depth of every contact point, over time.
class Depths {
 public:
  Depths(const Model& model, const Ground<double>& ground) : model_(model), ground_(ground) {
    ground_.plain = false;  // one way for all
  }
  void look(const BodyState<double>& body) {
    const auto& tree = model_.figures().tree;
    std::array<double, kMaxJoints> angle{};
    for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
        angle[static_cast<std::size_t>(tree.leg[l].joint[i].order)] = body.angle[l][i];
      }
    }
    const Rotation<double> axes = rotation_of(body.attitude);
    const Below<double> below = below_of(ground_, axes, body.position);
    const ShapedFooting<double> on{ground_, below, stand_of(ground_, axes, body.position), 1e-3};
    before_.swap(depth_);
    depth_.clear();
    const auto one = [&](const V3& place, double radius) {
      depth_.push_back(std::max(0.0, lie_of(on, place, radius).depth));
    };
    for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
      for_points(tree.leg[l], angle.data(), one);
    }
    for (const auto& corner : tree.corner) one(corner, 0);
    since_.resize(depth_.size(), 0);
  }
  /// In the springs of the ground.
  [[nodiscard]] double energy() const {
    double sum = 0;
    for (const double d : depth_) sum += 0.5 * ground_.stiffness * d * d;
    return sum;
  }
  /// In springs that were met in the last step, and so were pressed for nothing.
  [[nodiscard]] double met() const {
    double sum = 0;
    for (std::size_t i = 0; i < before_.size(); ++i) {
      if (before_[i] == 0) sum += 0.5 * ground_.stiffness * depth_[i] * depth_[i];
    }
    return sum;
  }
  /// Looks for which some point has been deeper than `most`.
  int deeper_than(double most) {
    int longest = 0;
    for (std::size_t i = 0; i < depth_.size(); ++i) {
      since_[i] = depth_[i] > most ? since_[i] + 1 : 0;
      longest = std::max(longest, since_[i]);
    }
    return longest;
  }
  [[nodiscard]] double deepest() const { return *std::max_element(depth_.begin(), depth_.end()); }

 private:
  const Model& model_;
  Ground<double> ground_;
  std::vector<double> depth_;
  std::vector<double> before_;
  std::vector<int> since_;
};

bool is_finite(const BodyState<double>& body) {
  double sum =
      body.position.x + body.position.y + body.position.z + body.attitude.w + body.rate.x + body.rate.y;
  for (const auto& leg : body.angle) {
    for (const double a : leg) sum += a;
  }
  for (const auto& leg : body.speed) {
    for (const double a : leg) sum += a;
  }
  return std::isfinite(sum);
}

/// Runs the robot and keeps the books. Source of what the step may win: semi-implicit Euler's local error is
/// of second order in dt. Turning at rate w, the velocity's step is off by (w dt)^2 of the energy (allowed,
/// it adds up to first order); places move with the new speeds and forces stand at the old places, half a
/// step of the power that is exchanged within the body and with gravity (once); a spring met during a step
/// was pressed for nothing by as much as the step went into it (allowed). All else, friction, damping and
/// implicit springs, only takes.
class Thrashing {
 public:
  Thrashing(const std::shared_ptr<const Model>& model, const Site& site, std::uint64_t seed)
      : model_(model),
        robot_(model, site, seed),
        lot_(seed + 77),
        depths_(*model, ground_of(site)),
        static_depth_(model->mass_kg() * 9.80665 / site.ground_stiffness_n_per_m) {
    robot_.place_standing(seed);
  }

  void run(double seconds, Thrashed& out) {
    const double dt = model_->period_s();
    const auto ticks = std::lround(seconds / dt);
    depths_.look(robot_.state().body);
    Energy now = energy_of(model_->figures(), robot_.state().body, dt);
    double balance = now.kinetic + now.stored + depths_.energy();
    double least = balance;  // of what was there less what came in and what is allowed
    double allowed = 0;
    double work = 0;
    for (long k = 0; k < ticks; ++k) {
      if (k % std::lround(0.05 / dt) == 0) draw_torques();
      const auto speed = robot_.state().body.speed;
      robot_.command(torque_, true);
      robot_.step();
      const auto& body = robot_.state().body;
      out.finite = out.finite && is_finite(body);
      if (!out.finite) return;
      work += work_of(speed, out.work_j);
      depths_.look(body);
      now = energy_of(model_->figures(), body, dt);
      allowed += dt * dt * now.kinetic * now.rate * now.rate + depths_.met() + now.met;
      balance = now.kinetic + now.stored + depths_.energy() - work;
      const double half_step =
          0.5 * dt * (model_->mass_kg() * 9.80665 * (fastest(body) + 1e-3) + now.kinetic * now.rate);
      least = std::min(least, balance - allowed);
      out.won_j = std::max(out.won_j, balance - allowed - least);
      out.won_share = std::max(out.won_share, (balance - allowed - least) / half_step);
      out.deep_s = std::max(out.deep_s, depths_.deeper_than(5 * static_depth_) * dt);
      out.depth_ratio = std::max(out.depth_ratio, depths_.deepest() / static_depth_);
    }
    out.allowed_j = allowed;
  }

 private:
  void draw_torques() {
    for (int j = 0; j < model_->joint_count(); ++j) {
      const double most = model_->envelope()[static_cast<std::size_t>(j)];
      torque_[j] = lot_.between(-most, most);
    }
  }
  static double fastest(const BodyState<double>& body) {
    return std::sqrt(dot(body.velocity, body.velocity));
  }
  /// Torque that acted in the last period times the mean of the speeds around it.
  double work_of(const std::array<PerChain<double>, kMaxTreeLegs>& speed, double& absolute) const {
    const auto& tree = model_->figures().tree;
    double work = 0;
    for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
        const auto j = static_cast<std::size_t>(tree.leg[l].joint[i].order);
        const double mean = 0.5 * (speed[l][i] + robot_.state().body.speed[l][i]);
        const double one = robot_.state().drives.torque[j] * mean * model_->period_s();
        work += one;
        absolute += std::fabs(one);
      }
    }
    return work;
  }

  std::shared_ptr<const Model> model_;
  SimulatedRobot robot_;
  Lot lot_;
  Depths depths_;
  double static_depth_;
  safety::Torques<> torque_;
};

}  // namespace

v1::Robot random_robot(std::uint64_t seed) {
  files::Defects defects;
  const auto shipped = files::read_robot(PASTERN_SOURCE_DIR "/hal_stub/robots/dunlin12.robot.txtpb", defects);
  v1::Robot robot = shipped->robot();
  const v1::Joint pattern = robot.joints(0);
  robot.set_name("random" + std::to_string(seed));
  robot.clear_joints();
  robot.clear_legs();
  robot.mutable_guard()->set_base_low_m(0.02);
  Growth(seed, robot, pattern).grow();
  return robot;
}

Thrashed thrash(std::uint64_t seed, double seconds, int substeps) {
  Thrashed out;
  v1::Robot robot = random_robot(seed);
  robot.set_cycle_hz(robot.cycle_hz() * substeps);
  std::string text;
  google::protobuf::TextFormat::PrintToString(robot, &text);
  files::Defects defects;
  const auto file = files::parse_robot(text, robot.name(), defects);
  if (!file) {
    out.refused = files::lines(defects);
    return out;
  }
  const auto model = Model::make(file->robot(), out.refused);
  if (!model) return out;
  out.joints = model->joint_count();
  for (const auto& limb : model->figures().tree.leg) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(limb.joint_count); ++i) {
      out.slides = out.slides || limb.joint[i].slides;
      out.branches = out.branches || (i > 0 && limb.joint[i].parent < static_cast<int>(i) - 1);
    }
  }
  Lot lot(seed + 5);
  const Site site = random_site(lot, *model);
  Thrashing(model, site, seed).run(seconds, out);
  return out;
}

}  // namespace pastern::stub
