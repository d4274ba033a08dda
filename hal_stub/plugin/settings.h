// What the plug-in and the stub robot's process both read: robot file, scenario, "key=value;key=value".
#pragma once

#include <cstdint>
#include <map>
#include <memory>
#include <string>

#include "hal_stub/robot/simulated_robot.h"

namespace pastern::stub {

/// Parses "key=value;key=value". False with a line: a part without '=', an empty or repeated key, a key not
/// in `known` (space-separated).
[[nodiscard]] bool parse_options(const std::string& text, const std::string& known,
                                 std::map<std::string, std::string>& options, std::string& error);

/// A robot lying on its mark, from its files. Null with one line in `error` (the first defect of a file, or
/// what the simulated robot cannot be). `scenario_file` may be empty: a nominal site. `drawn`, when given,
/// becomes one line that tells the site as it was drawn; empty when the scenario has no ranges.
[[nodiscard]] std::unique_ptr<SimulatedRobot> robot_from_files(const std::string& robot_file,
                                                               const std::string& scenario_file,
                                                               std::uint64_t seed, std::string& error,
                                                               std::string* drawn = nullptr);

}  // namespace pastern::stub
