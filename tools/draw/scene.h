// What is drawn of a walk: places of the robot's parts at equal times, in metres, world axes (x along the
// lane, y to the left, z up). From a simulated walk, with contact forces, or from a recorded one.
#pragma once

#include <array>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "hal_stub/robot/simulated_robot.h"
#include "pastern/v1/episode.pb.h"
#include "tools/train/course.h"

namespace pastern::tools {

using Place = std::array<double, 3>;

/// A leg from its first joint to the foot's lowest point.
struct DrawnLeg {
  std::vector<Place> points;
  double force_n{0};  ///< of the ground on the foot, along its normal; 0 when it was not recorded
};

/// The robot at one time.
struct Still {
  double time_s{0};
  std::array<Place, 8> trunk{};  ///< corners: x, then y, then z from low to high (bits 0, 1, 2)
  Place centre{};
  std::vector<DrawnLeg> legs;
};

struct Scene {
  std::string title;
  std::vector<std::string> lines;  ///< facts under the title
  double period_s{0.02};           ///< between stills
  std::vector<Still> stills;
  std::vector<bool> left;  ///< legs whose hip is left of the middle
  double slope_rad{0};
  double weight_n{0};  ///< of robot and load: the measure of forces
  bool forces{false};  ///< known
};

inline constexpr double kStillPeriod_s = 0.02;

/// The robot as a simulation knows it.
[[nodiscard]] Still still_of(const stub::SimulatedRobot& robot, double time_s);

/// A recorded walk: the trunk's estimated place and attitude, joints as the encoders gave them. Nothing, with
/// a line in `why`, when the record does not hold the joints of this robot.
[[nodiscard]] std::optional<Scene> recorded_scene(const stub::Model& model, const v1::Trace& trace,
                                                  std::string& why);

/// Names the sides and the weight of an empty scene.
void describe(const stub::Model& model, double load_kg, Scene& scene);

}  // namespace pastern::tools
