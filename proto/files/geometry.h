// Where the links of a robot file stand when its joints are at given angles: for checks of the file only.
#pragma once

#include <array>
#include <string>
#include <vector>

#include "pastern/v1/robot.pb.h"

namespace pastern::files {

using Point = std::array<double, 3>;

/// Index of the joint with this name, or -1.
[[nodiscard]] int find_joint(const v1::Robot& robot, const std::string& name);

/// Feet in the trunk frame, m, one a leg, with joint i at angles[i] (rad; m for a prismatic joint).
/// Requires parents that exist and come before their children, and legs whose joints exist.
[[nodiscard]] std::vector<Point> feet_in_trunk(const v1::Robot& robot, const std::vector<double>& angles);

/// Height of the trunk frame's origin over the lowest point of the feet in the stance, m, trunk level.
[[nodiscard]] double stance_height(const v1::Robot& robot);

}  // namespace pastern::files
