// Small sound files of every kind, with every field said, as a ground for damage.
#pragma once

#include <google/protobuf/message.h>

#include <string>

#include "pastern/v1/plan.pb.h"
#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "pastern/v1/scenario.pb.h"
#include "proto/files/robot_file.h"

namespace pastern::fixture {

/// Two legs with abduction and two without: ten joints.
[[nodiscard]] v1::Robot robot();
[[nodiscard]] v1::Scenario scenario();
[[nodiscard]] v1::Plan plan();
/// For robot(): five inputs, a layer of three tanh units, ten actions, two groups.
[[nodiscard]] v1::Policy policy();

[[nodiscard]] std::string text(const google::protobuf::Message& message);
/// robot(), read. Aborts when the fixture itself is not sound.
[[nodiscard]] const files::RobotFile& robot_file();

}  // namespace pastern::fixture
