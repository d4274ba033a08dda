// A scenario file that has been read and checked against its robot (joint names exist).
#pragma once

#include <optional>
#include <string>

#include "pastern/v1/scenario.pb.h"
#include "proto/files/robot_file.h"

namespace pastern::files {

[[nodiscard]] std::optional<v1::Scenario> parse_scenario(const std::string& text, const std::string& file,
                                                         const RobotFile& robot, Defects& defects);
[[nodiscard]] std::optional<v1::Scenario> read_scenario(const std::string& path, const RobotFile& robot,
                                                        Defects& defects);

}  // namespace pastern::files
