// A URDF file, judged: what a robot file cannot take from it and why, and the robot file's beginnings when
// all is well. On the main thread; quiet. URDF and Pastern agree on frames: x forward, y left, z up.
#pragma once

#include <array>
#include <optional>
#include <string>
#include <vector>

#include "pastern/v1/robot.pb.h"
#include "proto/files/defect.h"

namespace pastern::tools {

/// A link without a joint of its own that moves: it has become part of another body. Feet are often told this
/// way.
struct MergedLink {
  std::string name;
  std::string joint;                ///< whose link it is part of; empty: the trunk
  std::array<double, 3> place_m{};  ///< of its frame's origin, in that link's frame
};

struct UrdfRobot {
  /// What URDF says: name, trunk, joints with axis, origin, link, range, friction; effort as the drive's peak
  /// torque, velocity as the gate's speed limit. Frames parallel to the trunk's at angle zero, parents before
  /// children, else in the file's order.
  v1::Robot robot;
  int links{0};
  double mass_kg{0};
  std::vector<MergedLink> merged;
  /// Fields that a robot file must have and URDF does not say: "joints[].stance_rad (12 joints)", "pack".
  std::vector<std::string> still_missing;
};

/// Every defect in one line with the element's name and line, as many as can be told at once: XML, names said
/// twice, loops, several roots, joints of a kind that a robot file has not, mimic joints, axes, limits,
/// masses and inertias that no body has, bodies with nothing but shapes, more than 32 joints, figures out of
/// a robot file's range.
[[nodiscard]] std::optional<UrdfRobot> parse_urdf(const std::string& text, const std::string& path,
                                                  files::Defects& defects);
[[nodiscard]] std::optional<UrdfRobot> read_urdf(const std::string& path, files::Defects& defects);

}  // namespace pastern::tools
