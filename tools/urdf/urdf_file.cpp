#include "tools/urdf/urdf_file.h"

#include <map>

#include "proto/files/check.h"
#include "proto/files/text.h"
#include "tools/urdf/skeleton.h"

namespace pastern::tools {
namespace {

/// "joints[3].link.mass_kg" -> 3 and ".link.mass_kg"; -1 and the whole for other fields.
int joint_of(const std::string& field, std::string& rest) {
  const std::string begin = "joints[";
  const std::size_t end = field.find(']');
  rest = field;
  if (field.rfind(begin, 0) != 0 || end == std::string::npos) return -1;
  rest = field.substr(end + 1);
  return std::stoi(field.substr(begin.size(), end - begin.size()));
}

/// The rules of a robot file on what there is: what is not there is still missing, what is out of range is a
/// defect.
void judge_skeleton(const std::string& path, UrdfRobot& made, files::Defects& defects) {
  files::Defects found;
  files::check_rules(made.robot, path, "", found);
  std::vector<std::string> order;
  std::map<std::string, int> joints;
  for (files::Defect& defect : found) {
    std::string rest;
    const int joint = joint_of(defect.field, rest);
    const bool missing = defect.found == "nothing" || (defect.field == "legs" && made.robot.legs().empty());
    if (!missing) {
      if (joint >= 0) defect.field = "joint " + shown_name(made.robot.joints(joint).name()) + rest;
      defects.push_back(defect);
      continue;
    }
    const std::string name = joint >= 0 ? "joints[]" + rest : rest;
    if (joints[name]++ == 0) order.push_back(name);
  }
  for (const std::string& name : order) {
    const bool of_joints = name.rfind("joints[]", 0) == 0;
    made.still_missing.push_back(of_joints ? name + " (" + std::to_string(joints[name]) +
                                                 (joints[name] == 1 ? " joint)" : " joints)")
                                           : name);
  }
}

}  // namespace

std::optional<UrdfRobot> parse_urdf(const std::string& text, const std::string& path,
                                    files::Defects& defects) {
  const std::size_t before = defects.size();
  const std::optional<UrdfDocument> document = read_document(text, path, defects);
  if (!document) return std::nullopt;
  const std::optional<UrdfLayout> layout = judge_document(*document, path, defects);
  if (!layout || defects.size() != before) return std::nullopt;
  std::optional<UrdfRobot> made = make_skeleton(*document, *layout, text, path, defects);
  if (!made) return std::nullopt;
  judge_skeleton(path, *made, defects);
  if (defects.size() != before) return std::nullopt;
  return made;
}

std::optional<UrdfRobot> read_urdf(const std::string& path, files::Defects& defects) {
  const std::optional<std::string> text = files::read_whole(path, defects);
  if (!text) return std::nullopt;
  return parse_urdf(*text, path, defects);
}

}  // namespace pastern::tools
