// Places of all parts by the simulated robot's own kinematics.
#include "tools/draw/scene.h"

#include <fmt/format.h>

#include <cmath>

namespace pastern::tools {
namespace {

using stub::Vec3;

Place place_in(const stub::BodyState<double>& body, const stub::Rotation<double>& axes,
               const Vec3<double>& at) {
  const Vec3<double> world = body.position + axes * at;
  return {world.x, world.y, world.z};
}

Still posed(const stub::Model& model, const stub::BodyState<double>& body, double time_s) {
  const auto& tree = model.figures().tree;
  stub::Work<double> work{};
  stub::begin_step(tree, stub::TrunkFigures<double>{tree.trunk.mass, tree.trunk.centre, tree.trunk.inertia},
                   body, work);
  Still still;
  still.time_s = time_s;
  still.centre = {body.position.x, body.position.y, body.position.z};
  for (unsigned c = 0; c < 8; ++c) {
    const Vec3<double>& h = tree.half_size;
    still.trunk[c] =
        place_in(body, work.body,
                 {(c & 1U) != 0 ? h.x : -h.x, (c & 2U) != 0 ? h.y : -h.y, (c & 4U) != 0 ? h.z : -h.z});
  }
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    const auto& leg = tree.leg[l];
    const auto& at = work.leg[l];
    DrawnLeg drawn;
    for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
      drawn.points.push_back(place_in(body, work.body, at.place[i]));
    }
    Place foot = place_in(body, work.body, at.foot);
    foot[2] -= leg.foot_radius;
    drawn.points.push_back(foot);
    drawn.force_n = body.grip.leg[l][0];
    still.legs.push_back(std::move(drawn));
  }
  return still;
}

/// Yaw, then pitch, then roll (z-y-x sequence) as a unit quaternion.
stub::Quat<double> attitude_of(double roll, double pitch, double yaw) {
  const stub::Quat<double> z{std::cos(yaw / 2), 0, 0, std::sin(yaw / 2)};
  const stub::Quat<double> y{std::cos(pitch / 2), 0, std::sin(pitch / 2), 0};
  const stub::Quat<double> x{std::cos(roll / 2), std::sin(roll / 2), 0, 0};
  return z * y * x;
}

}  // namespace

Still still_of(const stub::SimulatedRobot& robot, double time_s) {
  return posed(robot.model(), robot.state().body, time_s);
}

std::optional<Scene> recorded_scene(const stub::Model& model, const v1::Trace& trace, std::string& why) {
  const int rows = trace.time_s_size();
  const int joints = model.joint_count();
  if (rows == 0 || trace.height_m_size() != rows || trace.yaw_rad_size() != rows ||
      trace.joint_angle_rad_size() != rows * joints) {
    why = fmt::format(
        "the record holds {} joint angles for {} samples, expected {} (a walk recorded by an "
        "older version holds none)",
        trace.joint_angle_rad_size(), rows, rows * joints);
    return std::nullopt;
  }
  Scene scene;
  scene.period_s = kStillPeriod_s;
  const auto& tree = model.figures().tree;
  for (int row = 0; row < rows; ++row) {
    stub::BodyState<double> body{};
    body.position = {trace.x_m(row), trace.y_m(row), trace.height_m(row)};
    body.attitude = attitude_of(trace.roll_rad(row), trace.pitch_rad(row), trace.yaw_rad(row));
    for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
        body.angle[l][i] = trace.joint_angle_rad(row * joints + tree.leg[l].joint[i].order);
      }
    }
    scene.stills.push_back(posed(model, body, trace.time_s(row)));
  }
  describe(model, 0, scene);
  return scene;
}

void describe(const stub::Model& model, double load_kg, Scene& scene) {
  const auto& tree = model.figures().tree;
  scene.weight_n = (model.mass_kg() + load_kg) * tree.gravity;
  scene.left.clear();
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    scene.left.push_back(tree.leg[l].joint[0].origin.y > 0);
  }
}

}  // namespace pastern::tools
