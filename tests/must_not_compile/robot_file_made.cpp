// A robot that was not checked does not pass for one that was: RobotFile comes from the parser.
#include "proto/files/robot_file.h"

int joints(const std::string& text, pastern::files::Defects& defects) {
#ifdef OFFENDING
  pastern::files::RobotFile robot;
  robot.robot_ = {};
  return robot.joint_count() + static_cast<int>(text.size() + defects.size());
#else
  const auto robot = pastern::files::parse_robot(text, "a.robot.txtpb", defects);
  return robot ? robot->joint_count() : 0;
#endif
}
