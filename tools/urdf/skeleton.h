// A sound URDF document -> the beginnings of a robot file.
#pragma once

#include "tools/urdf/judge.h"
#include "tools/urdf/urdf_file.h"

namespace pastern::tools {

/// Poses are read by urdfdom; what it refuses is a defect in its own words.
[[nodiscard]] std::optional<UrdfRobot> make_skeleton(const UrdfDocument& document, const UrdfLayout& layout,
                                                     const std::string& text, const std::string& path,
                                                     files::Defects& defects);

}  // namespace pastern::tools
