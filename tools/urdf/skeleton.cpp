#include "tools/urdf/skeleton.h"

#include <console_bridge/console.h>
#include <urdf_parser/urdf_parser.h>

#include <Eigen/Dense>
#include <cmath>

namespace pastern::tools {
namespace {

using Eigen::Matrix3d;
using Eigen::Vector3d;

/// Keeps what urdfdom would print.
class Listener final : public console_bridge::OutputHandler {
 public:
  Listener() {
    console_bridge::useOutputHandler(this);
    console_bridge::setLogLevel(console_bridge::CONSOLE_BRIDGE_LOG_ERROR);
  }
  ~Listener() override { console_bridge::restorePreviousOutputHandler(); }
  void log(const std::string& text, console_bridge::LogLevel level, const char*, int) override {
    if (level >= console_bridge::CONSOLE_BRIDGE_LOG_ERROR) heard.push_back(shown_name(text));
  }
  std::vector<std::string> heard;
};

urdf::ModelInterfaceSharedPtr parsed(const std::string& text, std::vector<std::string>& heard) {
  Listener listener;
  urdf::ModelInterfaceSharedPtr model;
  try {
    model = urdf::parseURDF(text);
  } catch (const std::exception& error) {
    listener.heard.push_back(shown_name(error.what()));
  }
  heard = listener.heard;
  if (!model && heard.empty()) heard.emplace_back("no reason given");
  return model;
}

Vector3d vec(const urdf::Vector3& a) { return {a.x, a.y, a.z}; }
Matrix3d matrix(const urdf::Rotation& r) {
  return Eigen::Quaterniond(r.w, r.x, r.y, r.z).normalized().toRotationMatrix();
}

/// Turning leaves crumbs of 1e-17 where zeros were.
double swept(double value, double size) { return std::abs(value) <= 1e-12 * size ? 0 : value; }

void put(const Vector3d& a, double size, v1::Xyz& to) {
  to.set_x(swept(a.x(), size));
  to.set_y(swept(a.y(), size));
  to.set_z(swept(a.z(), size));
}

/// Masses that move as one, in a frame parallel to the trunk's.
struct Body {
  double mass{0};
  Vector3d moment{Vector3d::Zero()};
  Matrix3d second{Matrix3d::Zero()};  ///< inertia about the frame's origin

  static Matrix3d parallel(double mass, const Vector3d& c) {
    return mass * (c.squaredNorm() * Matrix3d::Identity() - c * c.transpose());
  }
  void add(double more, const Vector3d& centre, const Matrix3d& inertia) {
    mass += more;
    moment += more * centre;
    second += inertia + parallel(more, centre);
  }
  void write(v1::Link& link) const {
    const Vector3d centre = moment / mass;
    const Matrix3d i = second - parallel(mass, centre);
    const double size = i.trace();
    link.set_mass_kg(mass);
    put(centre, 1, *link.mutable_centre_of_mass_m());
    auto& to = *link.mutable_inertia();
    to.set_xx(i(0, 0));
    to.set_yy(i(1, 1));
    to.set_zz(i(2, 2));
    if (const double xy = swept(i(0, 1), size); xy != 0) to.set_xy(xy);
    if (const double xz = swept(i(0, 2), size); xz != 0) to.set_xz(xz);
    if (const double yz = swept(i(1, 2), size); yz != 0) to.set_yz(yz);
  }
};

/// Where a link's frame lies at angle zero.
struct Placed {
  int body{-1};                         ///< index in the robot's joints; -1: the trunk
  Matrix3d axes{Matrix3d::Identity()};  ///< link to trunk
  Vector3d place{Vector3d::Zero()};     ///< in the body's frame
};

class Builder {
 public:
  Builder(const UrdfDocument& document, const UrdfLayout& layout, const urdf::ModelInterface& model)
      : said_(document), layout_(layout), model_(model), placed_(document.links.size()) {}

  UrdfRobot run() {
    made_.robot.set_name(said_.name);
    made_.links = static_cast<int>(said_.links.size());
    bodies_.emplace_back();  // the trunk
    take_link(layout_.root);
    for (const int j : layout_.order) take_joint(static_cast<std::size_t>(j));
    bodies_[0].write(*made_.robot.mutable_trunk()->mutable_link());
    for (int j = 0; j < made_.robot.joints_size(); ++j) {
      bodies_[static_cast<std::size_t>(j) + 1].write(*made_.robot.mutable_joints(j)->mutable_link());
    }
    for (const Body& body : bodies_) made_.mass_kg += body.mass;
    return made_;
  }

 private:
  std::string name_of(int body) const { return body < 0 ? std::string() : made_.robot.joints(body).name(); }

  void take_link(int index) {
    const auto i = static_cast<std::size_t>(index);
    const auto& link = model_.getLink(said_.links[i].name);
    const Placed& at = placed_[i];
    if (!link->inertial) return;
    const urdf::Inertial& found = *link->inertial;
    const Matrix3d axes = at.axes * matrix(found.origin.rotation);
    Matrix3d inertia;
    inertia << found.ixx, found.ixy, found.ixz, found.ixy, found.iyy, found.iyz, found.ixz, found.iyz,
        found.izz;
    bodies_[static_cast<std::size_t>(at.body + 1)].add(
        found.mass, at.place + at.axes * vec(found.origin.position), axes * inertia * axes.transpose());
  }

  void take_joint(std::size_t j) {
    const JointSaid& said = said_.joints[j];
    const auto& joint = *model_.getJoint(said.name);
    const auto& pose = joint.parent_to_joint_origin_transform;
    const Placed& parent = placed_[static_cast<std::size_t>(layout_.parent_link[j])];
    Placed& child = placed_[static_cast<std::size_t>(layout_.child_link[j])];
    const Vector3d origin = parent.place + parent.axes * vec(pose.position);
    child.axes = parent.axes * matrix(pose.rotation);
    if (kind_of(said) == JointKind::fixed) {
      child.body = parent.body;
      child.place = origin;
      made_.merged.push_back({said.child, name_of(child.body), {origin.x(), origin.y(), origin.z()}});
    } else {
      v1::Joint& to = *made_.robot.add_joints();
      to.set_name(said.name);
      if (parent.body >= 0) to.set_parent(name_of(parent.body));
      put((child.axes * vec(joint.axis)).normalized(), 1, *to.mutable_axis());
      put(origin, 1, *to.mutable_origin_m());
      take_figures(said, to);
      child.body = made_.robot.joints_size() - 1;
      bodies_.emplace_back();
    }
    take_link(layout_.child_link[j]);
  }

  static void take_figures(const JointSaid& said, v1::Joint& to) {
    const JointKind kind = kind_of(said);
    to.set_kind(kind == JointKind::sliding ? v1::Joint::PRISMATIC : v1::Joint::HINGE);
    const double turns = 4 * M_PI;  // what a robot file allows to a joint without end stops
    to.set_angle_min_rad(kind == JointKind::turning ? -turns : said.lower.value_or(0));
    to.set_angle_max_rad(kind == JointKind::turning ? turns : said.upper.value_or(0));
    if (said.effort) to.mutable_drive()->set_peak_torque_nm(*said.effort);
    if (said.velocity) to.mutable_guard()->set_speed_max_rad_per_s(*said.velocity);
    if (said.damping) to.mutable_drive()->set_damping_nm_s_per_rad(*said.damping);
    if (said.friction) to.mutable_drive()->set_coulomb_nm(*said.friction);
  }

  const UrdfDocument& said_;
  const UrdfLayout& layout_;
  const urdf::ModelInterface& model_;
  std::vector<Placed> placed_;
  std::vector<Body> bodies_;
  UrdfRobot made_;
};

}  // namespace

std::optional<UrdfRobot> make_skeleton(const UrdfDocument& document, const UrdfLayout& layout,
                                       const std::string& text, const std::string& path,
                                       files::Defects& defects) {
  std::vector<std::string> heard;
  const auto model = parsed(text, heard);
  if (!model) {
    for (const std::string& line : heard)
      defects.push_back({path, "", line, "a URDF document that urdfdom takes"});
    return std::nullopt;
  }
  return Builder(document, layout, *model).run();
}

}  // namespace pastern::tools
