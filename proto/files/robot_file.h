// A robot file that has been read, parsed and checked; it cannot be wrong afterwards.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "pastern/v1/robot.pb.h"
#include "proto/files/defect.h"
#include "proto/files/sha256.h"

namespace pastern::files {

class RobotFile {
 public:
  [[nodiscard]] const v1::Robot& robot() const { return robot_; }
  [[nodiscard]] const Sha256& sha256() const { return sha256_; }
  [[nodiscard]] const std::string& path() const { return path_; }
  [[nodiscard]] int joint_count() const { return robot_.joints_size(); }
  /// Index in the joint order, or -1.
  [[nodiscard]] int joint_index(const std::string& name) const;

 private:
  friend std::optional<RobotFile> parse_robot(const std::string& text, const std::string& path,
                                              Defects& defects);
  v1::Robot robot_;
  Sha256 sha256_{};
  std::string path_;
};

/// Beyond the field rules: unique names; parents exist and come before their children (so no loops); unit
/// axes; inertias possible (triangle inequality); angle_min < stance, lying < angle_max by more than the soft
/// edge; guard limits ordered (soft < hard, warm < max, peak <= trip, tilt < tilt_at_once, pack_low <
/// pack_floor < nominal, base_low below the stance height); legs name a chain abduction -> hip -> knee of
/// hinges, each joint in at most one leg, hip and knee axes along y; legs' knee bends in the stance; stops
/// name causes; damp_s + lower_s <= 1.5.
[[nodiscard]] std::optional<RobotFile> parse_robot(const std::string& text, const std::string& path,
                                                   Defects& defects);
[[nodiscard]] std::optional<RobotFile> read_robot(const std::string& path, Defects& defects);

/// The names that `guard.stops[].cause` may hold: those of safety::Cause, written as there. proto sees
/// nothing of ours, so a test keeps the two lists equal.
[[nodiscard]] const std::vector<std::string>& cause_names();

}  // namespace pastern::files
