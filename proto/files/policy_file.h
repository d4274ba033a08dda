// A policy file that has been read and checked against its robot.
#pragma once

#include <optional>
#include <string>

#include "pastern/v1/policy.pb.h"
#include "proto/files/robot_file.h"

namespace pastern::files {

class PolicyFile {
 public:
  [[nodiscard]] const v1::Policy& policy() const { return policy_; }
  [[nodiscard]] const Sha256& sha256() const { return sha256_; }  ///< of the file's bytes
  [[nodiscard]] const std::string& bytes() const { return bytes_; }

 private:
  friend std::optional<PolicyFile> parse_policy(const std::string& bytes, const std::string& file,
                                                const RobotFile& robot, Defects& defects);
  v1::Policy policy_;
  Sha256 sha256_{};
  std::string bytes_;
};

/// Checks: artefact frame; format 1; robot name equal; finite parameters, their number equal to what the
/// layers hold; the layers chain from the number of channels to the number of actions (every leg of the robot
/// once, known names; 3 actions for a leg with abduction, 2 without); rates: rate_hz in 5..cycle_hz and
/// dividing cycle_hz, gait_hz in 0.2..10; scales finite, non-zero; groups inside the parameters, not
/// overlapping, scale > 0; at most 512 inputs, 1 024 units a layer, 8 layers.
[[nodiscard]] std::optional<PolicyFile> parse_policy(const std::string& bytes, const std::string& file,
                                                     const RobotFile& robot, Defects& defects);
[[nodiscard]] std::optional<PolicyFile> read_policy(const std::string& path, const RobotFile& robot,
                                                    Defects& defects);

/// The message as file bytes.
[[nodiscard]] std::string pack_policy(const v1::Policy& policy);

}  // namespace pastern::files
