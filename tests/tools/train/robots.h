// Shipped robots for tests of training.
#pragma once

#include <gtest/gtest.h>

#include <memory>
#include <stdexcept>
#include <string>

#include "hal_stub/robot/model.h"
#include "proto/files/robot_file.h"

namespace pastern::tools::test {

inline std::string robot_path(const std::string& name) {
  return std::string(PASTERN_SOURCE_DIR) + "/hal_stub/robots/" + name + ".robot.txtpb";
}

inline files::RobotFile robot(const std::string& name) {
  files::Defects defects;
  auto file = files::read_robot(robot_path(name), defects);
  if (!file) throw std::runtime_error(files::lines(defects));
  return *file;
}

inline std::shared_ptr<const stub::Model> model(const std::string& name) {
  std::string error;
  auto made = stub::Model::make(robot(name).robot(), error);
  if (!made) throw std::runtime_error(error);
  return made;
}

}  // namespace pastern::tools::test
