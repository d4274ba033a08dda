// Any text as a robot, scenario or plan file: refused with lines that are lines, or accepted, and then what
// was accepted is accepted again when it is written out.
#include <google/protobuf/text_format.h>

#include "proto/files/plan_file.h"
#include "proto/files/policy_file.h"
#include "proto/files/scenario_file.h"
#include "runtime/link/wire.h"
#include "tests/fuzz/input.h"

namespace pastern::fuzz {
namespace {

const files::RobotFile& a_robot() {
  static const files::RobotFile kRobot = [] {
    files::Defects defects;
    auto robot = files::read_robot(PASTERN_SOURCE_DIR "/hal_stub/robots/dunlin8.robot.txtpb", defects);
    expect(robot.has_value(), "the shipped robot file is accepted");
    return *robot;
  }();
  return kRobot;
}

std::string written(const google::protobuf::Message& message) {
  std::string text;
  google::protobuf::TextFormat::PrintToString(message, &text);
  return text;
}

void judge(bool accepted, const files::Defects& defects) {
  expect(accepted == defects.empty(), "refused with a defect, or accepted without one");
  if (accepted) return;
  const std::string lines = files::lines(defects);
  expect(!lines.empty() && lines.back() == '\n', "defects are lines");
  for (const char c : lines) {
    const auto byte = static_cast<unsigned char>(c);
    expect(c == '\n' || byte >= 0x20, "no control character reaches the terminal");
  }
}

void robot(const std::string& text) {
  files::Defects defects;
  const auto file = files::parse_robot(text, "in", defects);
  judge(file.has_value(), defects);
  if (!file) return;
  files::Defects again;
  expect(files::parse_robot(written(file->robot()), "in", again).has_value(), "accepted again");
}

void scenario(const std::string& text) {
  files::Defects defects;
  const auto file = files::parse_scenario(text, "in", a_robot(), defects);
  judge(file.has_value(), defects);
  if (!file) return;
  files::Defects again;
  expect(files::parse_scenario(written(*file), "in", a_robot(), again).has_value(), "accepted again");
}

void plan(const std::string& text) {
  files::Defects defects;
  const auto file = files::parse_plan(text, "in", defects);
  judge(file.has_value(), defects);
  if (!file) return;
  files::Defects again;
  expect(files::parse_plan(written(*file), "in", again).has_value(), "accepted again");
}

}  // namespace
}  // namespace pastern::fuzz

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  pastern::link::wire::silence_protobuf();
  const std::string text(reinterpret_cast<const char*>(data), size);
  pastern::fuzz::robot(text);
  pastern::fuzz::scenario(text);
  pastern::fuzz::plan(text);
  return 0;
}
