// Reads a robot file and judges what no single field can show.
#include "proto/files/robot_file.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <set>

#include "proto/files/geometry.h"
#include "proto/files/text.h"
#include "proto/files/words.h"

namespace pastern::files {
namespace {

constexpr double kUnit = 1e-3;  // how far an axis written with four digits may be from a unit vector
constexpr double kLeastBend =
    0.1;  // rad, of a knee in the stance: a straight leg has no leg length to control
constexpr double kStopWithin = 1.5;    // s, stop category 1: torque off after this at the latest
constexpr std::size_t kMostChain = 4;  // joints from the trunk to a foot, as the gate holds them

// One line a defect; every judgement is written so that NaN is refused.
class Judge {
 public:
  Judge(const v1::Robot& robot, const std::string& file, Defects& defects)
      : robot_(robot), file_(file), defects_(defects) {}

  void run() {
    const std::size_t before = defects_.size();
    trunk();
    for (int i = 0; i < robot_.joints_size(); ++i) joint(i);
    for (int i = 0; i < robot_.legs_size(); ++i) leg(i);
    guard();
    // The pose needs a tree and legs that are sound.
    if (defects_.size() == before) pose();
  }

 private:
  void require(bool sound, const std::string& field, const std::string& found, const std::string& expected) {
    if (!sound) defects_.push_back({file_, field, found, expected});
  }
  void require(bool sound, const std::string& field, double found, const std::string& expected) {
    require(sound, field, shown_number(found), expected);
  }

  void trunk() {
    const v1::Xyz& size = robot_.trunk().size_m();
    require(size.x() > 0, "trunk.size_m.x", size.x(), "a length above 0 (m)");
    require(size.y() > 0, "trunk.size_m.y", size.y(), "a length above 0 (m)");
    require(size.z() > 0, "trunk.size_m.z", size.z(), "a length above 0 (m)");
    inertia(robot_.trunk().link(), "trunk.link.inertia");
  }

  // A body of positive density has a positive second-moment matrix J = tr(I)/2 1 - I; with J diagonal this is
  // the triangle inequality of the moments.
  void inertia(const v1::Link& link, const std::string& field) {
    const v1::Inertia& i = link.inertia();
    const double most = std::max({i.xx(), i.yy(), i.zz()});
    const double sum = i.xx() + i.yy() + i.zz();
    const double slack = 1e-9 * sum;
    if (!(2 * most <= sum + slack)) {
      require(false, field, "a moment of " + shown_number(most),
              "each of xx, yy, zz at most the sum of the other two");
      return;
    }
    const double half = sum / 2;
    const double a = half - i.xx();
    const double b = half - i.yy();
    const double c = half - i.zz();
    const double minor =
        std::min({a * b - i.xy() * i.xy(), a * c - i.xz() * i.xz(), b * c - i.yz() * i.yz()});
    const double det = a * b * c - 2 * i.xy() * i.yz() * i.xz() - a * i.yz() * i.yz() - b * i.xz() * i.xz() -
                       c * i.xy() * i.xy();
    require(minor >= -slack * half && det >= -slack * half * half, field, "products xy, xz, yz too large",
            "moments and products that a body can have");
  }

  void joint(int index) {
    const v1::Joint& joint = robot_.joints(index);
    const std::string at = "joints[" + std::to_string(index) + "]";
    const int same = find_joint(robot_, joint.name());
    require(same == index, at + ".name", joint.name(), "a name that no other joint has");
    if (!joint.parent().empty()) {
      const int parent = find_joint(robot_, joint.parent());
      require(parent >= 0 && parent < index, at + ".parent", joint.parent(),
              "a joint listed before this one, or nothing for the trunk");
    }
    const v1::Xyz& axis = joint.axis();
    const double length = std::sqrt(axis.x() * axis.x() + axis.y() * axis.y() + axis.z() * axis.z());
    require(std::abs(length - 1) <= kUnit, at + ".axis", "length " + shown_number(length), "a unit vector");
    inertia(joint.link(), at + ".link.inertia");
    require(!joint.has_tip_radius_m() || joint.has_tip_m(), at + ".tip_radius_m", "a radius without a tip",
            "tip_m beside it");
    range(joint, at);
    drive(joint, at);
  }

  void range(const v1::Joint& joint, const std::string& at) {
    const double edge = joint.guard().soft_edge_rad();
    const double low = joint.angle_min_rad() + edge;
    const double high = joint.angle_max_rad() - edge;
    require(low < high, at + ".angle_max_rad", joint.angle_max_rad(),
            "more than angle_min_rad and both soft edges: above " +
                shown_number(joint.angle_min_rad() + 2 * edge) + " (rad)");
    const std::string inside = "above " + shown_number(low) + " and below " + shown_number(high) +
                               ": inside the joint's range by more than guard.soft_edge_rad (rad)";
    require(low < joint.stance_rad() && joint.stance_rad() < high, at + ".stance_rad", joint.stance_rad(),
            inside);
    require(low < joint.lying_rad() && joint.lying_rad() < high, at + ".lying_rad", joint.lying_rad(),
            inside);
  }

  void drive(const v1::Joint& joint, const std::string& at) {
    const v1::Drive& drive = joint.drive();
    const v1::JointGuard& guard = joint.guard();
    require(drive.rated_torque_nm() <= drive.peak_torque_nm(), at + ".drive.rated_torque_nm",
            drive.rated_torque_nm(), "at most drive.peak_torque_nm");
    require(drive.has_derate_warm_c() == drive.has_derate_hot_c(),
            at + (drive.has_derate_warm_c() ? ".drive.derate_warm_c" : ".drive.derate_hot_c"),
            "one without the other", "derate_warm_c and derate_hot_c");
    require(!drive.has_derate_hot_c() || drive.derate_warm_c() < drive.derate_hot_c(),
            at + ".drive.derate_hot_c", drive.derate_hot_c(),
            "more than derate_warm_c, " + shown_number(drive.derate_warm_c()) + " (deg C)");
    const double through = drive.current_limit_a() * drive.torque_per_amp_nm();
    require(!drive.has_current_limit_a() || through >= drive.rated_torque_nm(), at + ".drive.current_limit_a",
            drive.current_limit_a(),
            "enough for rated_torque_nm, " +
                shown_number(drive.rated_torque_nm() / drive.torque_per_amp_nm()) + " (A) or more");
    require(guard.peak_torque_nm() <= drive.peak_torque_nm(), at + ".guard.peak_torque_nm",
            guard.peak_torque_nm(), "at most drive.peak_torque_nm, " + shown_number(drive.peak_torque_nm()));
    require(guard.peak_torque_nm() <= guard.trip_torque_nm(), at + ".guard.trip_torque_nm",
            guard.trip_torque_nm(), "at least guard.peak_torque_nm, " + shown_number(guard.peak_torque_nm()));
    require(guard.soft_speed_rad_per_s() < guard.speed_max_rad_per_s(), at + ".guard.soft_speed_rad_per_s",
            guard.soft_speed_rad_per_s(),
            "below guard.speed_max_rad_per_s, " + shown_number(guard.speed_max_rad_per_s()));
    require(guard.winding_warm_c() < guard.winding_max_c(), at + ".guard.winding_warm_c",
            guard.winding_warm_c(), "below guard.winding_max_c, " + shown_number(guard.winding_max_c()));
    require(joint.stiffness_nm_per_rad() > 0, at + ".stiffness_nm_per_rad", joint.stiffness_nm_per_rad(),
            "a gain above 0, else the joint hangs loose (N m/rad)");
  }

  void leg(int index) {
    const v1::Leg& leg = robot_.legs(index);
    const std::string at = "legs[" + std::to_string(index) + "]";
    for (int i = 0; i < index; ++i) {
      require(robot_.legs(i).name() != leg.name(), at + ".name", leg.name(), "a name that no other leg has");
    }
    const int hip = leg_joint(leg.hip(), at + ".hip");
    const int knee = leg_joint(leg.knee(), at + ".knee");
    const int abduction = leg.abduction().empty() ? -1 : leg_joint(leg.abduction(), at + ".abduction");
    if (hip < 0 || knee < 0 || (abduction < 0 && !leg.abduction().empty())) return;
    carried_by(robot_.joints(knee), leg.hip(), at + ".knee");
    if (abduction >= 0) carried_by(robot_.joints(hip), leg.abduction(), at + ".hip");
    along_y(robot_.joints(hip), at + ".hip");
    along_y(robot_.joints(knee), at + ".knee");
    require(!robot_.joints(knee).has_tip_m(), at + ".knee", leg.knee() + " with a tip_m",
            "none: the leg's foot touches the ground");
    chain_length(knee, at + ".knee");
    bend(leg, robot_.joints(knee), at + ".knee");
  }

  // Index of a hinge that no other leg uses, or -1 with a defect.
  int leg_joint(const std::string& name, const std::string& field) {
    const int index = find_joint(robot_, name);
    require(index >= 0, field, name, "the name of a joint");
    if (index < 0) return -1;
    require(robot_.joints(index).kind() == v1::Joint::HINGE, field, name + ", not a hinge", "a hinge");
    require(used_.insert(index).second, field, name + ", used before", "a joint of this leg alone");
    return index;
  }

  void carried_by(const v1::Joint& joint, const std::string& parent, const std::string& field) {
    require(joint.parent() == parent, field,
            joint.name() + " carried by " + (joint.parent().empty() ? "the trunk" : joint.parent()),
            "a joint carried by " + parent);
  }

  // Leg angle and leg length are worked out in the plane across y.
  void along_y(const v1::Joint& joint, const std::string& field) {
    require(std::abs(joint.axis().x()) <= kUnit && std::abs(joint.axis().z()) <= kUnit, field,
            "axis of " + joint.name() + " not along y", "an axis along y");
  }

  void chain_length(int joint, const std::string& field) {
    std::size_t count = 0;
    // Bounded: a parent that does not come before its child has been refused, and would end the walk here.
    for (int at = joint; at >= 0 && count <= kMostChain; ++count) {
      const int parent = find_joint(robot_, robot_.joints(at).parent());
      at = parent < at ? parent : -1;
    }
    require(count <= kMostChain, field, "more than 4 joints from the trunk", "at most 4");
  }

  void bend(const v1::Leg& leg, const v1::Joint& knee, const std::string& field) {
    const v1::Xyz& thigh = knee.origin_m();
    const v1::Xyz& shank = leg.foot_m();
    const double upper = std::hypot(thigh.x(), thigh.z());
    const double lower = std::hypot(shank.x(), shank.z());
    require(upper > 0.01 && lower > 0.01, field,
            "segments of " + shown_number(upper) + " and " + shown_number(lower) + " m",
            "thigh and shank longer than 0.01 m across y");
    if (!(upper > 0.01 && lower > 0.01)) return;
    // About +y by q: x' = c x + s z, z' = c z - s x.
    const double q = knee.axis().y() >= 0 ? knee.stance_rad() : -knee.stance_rad();
    const double x = std::cos(q) * shank.x() + std::sin(q) * shank.z();
    const double z = std::cos(q) * shank.z() - std::sin(q) * shank.x();
    const double angle = std::abs(std::atan2(thigh.x() * z - thigh.z() * x, thigh.x() * x + thigh.z() * z));
    require(angle >= kLeastBend && angle <= M_PI - kLeastBend, field,
            "a knee bent by " + shown_number(angle) + " rad in the stance",
            "a bend of at least 0.1 rad, neither straight nor folded");
  }

  void guard() {
    const v1::Guard& guard = robot_.guard();
    const double tick = 1 / robot_.cycle_hz();
    require(guard.tilt_rad() < guard.tilt_at_once_rad(), "guard.tilt_rad", guard.tilt_rad(),
            "below guard.tilt_at_once_rad, " + shown_number(guard.tilt_at_once_rad()));
    require(guard.pack_low_v() < guard.pack_floor_v(), "guard.pack_low_v", guard.pack_low_v(),
            "below guard.pack_floor_v, " + shown_number(guard.pack_floor_v()));
    require(guard.pack_floor_v() < robot_.pack().nominal_voltage_v(), "guard.pack_floor_v",
            guard.pack_floor_v(),
            "below pack.nominal_voltage_v, " + shown_number(robot_.pack().nominal_voltage_v()));
    require(guard.damp_s() + guard.lower_s() <= kStopWithin, "guard.lower_s",
            "damp_s + lower_s = " + shown_number(guard.damp_s() + guard.lower_s()),
            "at most 1.5 s until torque off");
    require(guard.body_rate_rad_per_s() <= robot_.sensors().rate_range_rad_per_s(),
            "guard.body_rate_rad_per_s", guard.body_rate_rad_per_s(),
            "within the range of the sensor, sensors.rate_range_rad_per_s, " +
                shown_number(robot_.sensors().rate_range_rad_per_s()));
    require(robot_.sensors().acceleration_range_m_per_s2() > 9.81, "sensors.acceleration_range_m_per_s2",
            robot_.sensors().acceleration_range_m_per_s2(), "more than gravity, 9.81 (m/s2)");
    require(guard.frame_stale_s() > tick, "guard.frame_stale_s", guard.frame_stale_s(),
            "more than a tick, " + shown_number(tick) + " (s)");
    require(guard.overrun_s() > tick / 2, "guard.overrun_s", guard.overrun_s(),
            "more than half a tick, " + shown_number(tick / 2) + " (s)");
    require(
        guard.drive_timeout_s() > 1.5 * tick, "guard.drive_timeout_s", guard.drive_timeout_s(),
        "more than 1.5 ticks, " + shown_number(1.5 * tick) + ", else every late tick cuts the drives (s)");
    const double step = robot_.sensors().encoder_step_rad();
    require(guard.frame_jump_rad() >= 20 * step, "guard.frame_jump_rad", guard.frame_jump_rad(),
            "at least 20 of sensors.encoder_step_rad, " + shown_number(20 * step) +
                " (rad): by a fifth of it a still encoder is judged stuck");
    stops();
  }

  void stops() {
    std::set<std::string> seen;
    for (int i = 0; i < robot_.guard().stops_size(); ++i) {
      const v1::Guard::Stop& stop = robot_.guard().stops(i);
      const std::string at = "guard.stops[" + std::to_string(i) + "]";
      const auto& known = cause_names();
      require(std::find(known.begin(), known.end(), stop.cause()) != known.end(), at + ".cause", stop.cause(),
              "the name of a cause, such as roll or baton_lost");
      require(seen.insert(stop.cause()).second, at + ".cause", stop.cause() + ", said before",
              "each cause once");
      require(stop.cause() != "operator_halt" || stop.stop() == v1::TORQUE_OFF, at + ".stop", "RAMP_DOWN",
              "TORQUE_OFF: a halt means torque off at once");
    }
  }

  void pose() {
    const double height = stance_height(robot_);
    require(height > 0, "legs", "feet above the trunk in the stance", "feet below the trunk");
    require(robot_.guard().base_low_m() < height, "guard.base_low_m", robot_.guard().base_low_m(),
            "below the height of the stance, " + shown_number(height) + " (m)");
  }

  const v1::Robot& robot_;
  const std::string& file_;
  Defects& defects_;
  std::set<int> used_;
};

}  // namespace

const std::vector<std::string>& cause_names() {
  static const std::vector<std::string> kNames{"roll",
                                               "pitch",
                                               "body_rate",
                                               "base_low",
                                               "measured_torque",
                                               "joint_position",
                                               "joint_speed",
                                               "winding_temperature",
                                               "thermal_model",
                                               "pack_voltage_low",
                                               "pack_current_high",
                                               "frame_not_finite",
                                               "frame_out_of_range",
                                               "frame_stale",
                                               "frame_frozen",
                                               "frame_jump",
                                               "tick_overrun",
                                               "baton_lost",
                                               "operator_stop",
                                               "operator_halt",
                                               "emergency_stop",
                                               "command_not_finite",
                                               "bus_error",
                                               "internal_stop"};
  return kNames;
}

int RobotFile::joint_index(const std::string& name) const { return find_joint(robot_, name); }

std::optional<RobotFile> parse_robot(const std::string& text, const std::string& path, Defects& defects) {
  RobotFile file;
  if (!parse_text(text, path, file.robot_, defects)) return std::nullopt;
  const std::size_t before = defects.size();
  Judge(file.robot_, path, defects).run();
  if (defects.size() != before) return std::nullopt;
  file.sha256_ = files::sha256(text);
  file.path_ = path;
  return file;
}

std::optional<RobotFile> read_robot(const std::string& path, Defects& defects) {
  const std::optional<std::string> text = read_whole(path, defects);
  if (!text) return std::nullopt;
  return parse_robot(*text, path, defects);
}

}  // namespace pastern::files
