// Files and options of the simulated robot.
#include "hal_stub/plugin/settings.h"

#include "proto/files/robot_file.h"
#include "proto/files/scenario_file.h"

namespace pastern::stub {
namespace {

bool is_known(const std::string& key, const std::string& known) {
  const std::string list = " " + known + " ";
  return list.find(" " + key + " ") != std::string::npos;
}

}  // namespace

bool parse_options(const std::string& text, const std::string& known,
                   std::map<std::string, std::string>& options, std::string& error) {
  std::size_t at = 0;
  while (at < text.size()) {
    const std::size_t end = std::min(text.find(';', at), text.size());
    const std::string part = text.substr(at, end - at);
    at = end + 1;
    if (part.empty()) continue;
    const std::size_t equal = part.find('=');
    const std::string key = part.substr(0, equal);
    if (equal == std::string::npos || key.empty()) {
      error = "options: found \"" + part + "\", expected key=value;key=value";
      return false;
    }
    if (!is_known(key, known)) {
      error = "options: found key \"" + key;
      error += "\", expected one of: " + known;
      return false;
    }
    if (!options.emplace(key, part.substr(equal + 1)).second) {
      error = "options: found \"" + key + "\" twice, expected it once";
      return false;
    }
  }
  return true;
}

std::unique_ptr<SimulatedRobot> robot_from_files(const std::string& robot_file,
                                                 const std::string& scenario_file, std::uint64_t seed,
                                                 std::string& error) {
  files::Defects defects;
  const auto robot = files::read_robot(robot_file, defects);
  if (!robot) {
    error = defects.front().line();
    return nullptr;
  }
  const auto model = Model::make(robot->robot(), error);
  if (!model) {
    error = robot_file + ": " + error;
    return nullptr;
  }
  Site site = nominal_site(*model);
  if (!scenario_file.empty()) {
    const auto scenario = files::read_scenario(scenario_file, *robot, defects);
    if (!scenario) {
      error = defects.front().line();
      return nullptr;
    }
    site = site_of(*scenario, *model, seed);
  }
  return std::make_unique<SimulatedRobot>(model, site, seed);
}

}  // namespace pastern::stub
