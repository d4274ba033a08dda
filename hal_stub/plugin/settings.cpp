// Files and options of the simulated robot.
#include "hal_stub/plugin/settings.h"

#include <google/protobuf/text_format.h>

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

namespace {

/// In the words of the file, so that it can be copied into one.
std::string drawn_words(const v1::Scenario& scenario, const Model& model, std::uint64_t seed) {
  if (scenario.drawn_size() == 0) return {};
  v1::Scenario site = drawn_scenario(scenario, model, seed);
  site.clear_about();
  google::protobuf::TextFormat::Printer printer;
  printer.SetSingleLineMode(true);
  std::string words;
  printer.PrintToString(site, &words);
  return "site drawn by seed " + std::to_string(seed) + ": " + words;
}

}  // namespace

std::unique_ptr<SimulatedRobot> robot_from_files(const std::string& robot_file,
                                                 const std::string& scenario_file, std::uint64_t seed,
                                                 std::string& error, std::string* drawn) {
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
    if (drawn != nullptr) *drawn = drawn_words(*scenario, *model, seed);
  }
  return std::make_unique<SimulatedRobot>(model, site, seed);
}

}  // namespace pastern::stub
