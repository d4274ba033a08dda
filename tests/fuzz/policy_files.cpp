// Any bytes as a policy file, and any bytes inside a frame whose length and checksum are right.
#include <cmath>

#include "proto/files/artefact.h"
#include "proto/files/policy_file.h"
#include "runtime/link/wire.h"
#include "runtime/policy/policy.h"
#include "tests/fuzz/input.h"

namespace pastern::fuzz {
namespace {

constexpr std::size_t kHeader = 20;
constexpr std::size_t kChecksum = 32;

const files::RobotFile& a_robot() {
  static const files::RobotFile kRobot = [] {
    files::Defects defects;
    auto robot = files::read_robot(PASTERN_SOURCE_DIR "/hal_stub/robots/dunlin12.robot.txtpb", defects);
    expect(robot.has_value(), "the shipped robot file is accepted");
    return *robot;
  }();
  return kRobot;
}

/// What was accepted can be made into a policy that walks one step with finite targets.
void use(const files::PolicyFile& file) {
  const auto policy = policy::Policy::make(file.policy(), a_robot().robot());
  expect(policy != nullptr, "an accepted file makes a policy");
  Parameters parameters(file.policy().parameters().begin(), file.policy().parameters().end());
  expect(parameters.size() == policy->parameter_count(), "as many parameters as the layers hold");
  for (const double value : parameters) expect(std::isfinite(value), "finite parameters");
  policy->load(parameters);
  policy->reset();
  const JointTarget<> target = policy->step({}, {}, {}, 1 / file.policy().rate_hz());
  for (int j = 0; j < a_robot().joint_count(); ++j) {
    const auto& joint = a_robot().robot().joints(j);
    const double angle = target.angle[j];
    expect(std::isnan(angle) || (angle >= joint.angle_min_rad() && angle <= joint.angle_max_rad()),
           "targets inside the joint's range");
  }
}

void judge(const std::string& bytes) {
  files::Defects defects;
  const auto file = files::parse_policy(bytes, "in", a_robot(), defects);
  expect(file.has_value() == defects.empty(), "refused with a defect, or accepted without one");
  if (file) use(*file);
}

}  // namespace
}  // namespace pastern::fuzz

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace pastern;
  link::wire::silence_protobuf();
  const std::string bytes(reinterpret_cast<const char*>(data), size);
  fuzz::judge(bytes);
  if (size < fuzz::kHeader + fuzz::kChecksum) return 0;
  v1::Policy message;
  if (message.ParseFromString(bytes.substr(fuzz::kHeader, size - fuzz::kHeader - fuzz::kChecksum))) {
    fuzz::judge(files::pack_policy(message));
  }
  return 0;
}
