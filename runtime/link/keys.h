// CURVE keys in files, one key a file, Z85 (RFC 32 of ZeroMQ). Private files 0600, refused if readable by
// others.
//   robot:  key_folder/robot.secret, robot.public, allowed/NAME.observer.public, allowed/NAME.operator.public
//   ground: key_folder/NAME.secret, NAME.public (one pair), robot.public
#pragma once

#include <string>
#include <vector>

namespace pastern::link {

struct AllowedKey {
  std::string name;
  bool commander{false};
  std::string public_z85;
};

struct RobotKeys {
  std::string public_z85;
  std::string secret_z85;
  std::vector<AllowedKey> allowed;
};

struct GroundKeys {
  std::string name;
  std::string public_z85;
  std::string secret_z85;
  std::string robot_public_z85;
};

/// Each: false with one line in `error` (file, found, expected). Nothing half-written.
[[nodiscard]] bool make_pair(const std::string& folder, const std::string& name, std::string& error);
[[nodiscard]] bool read_robot_keys(const std::string& folder, RobotKeys& keys, std::string& error);
[[nodiscard]] bool read_ground_keys(const std::string& folder, GroundKeys& keys, std::string& error);
[[nodiscard]] bool allow(const std::string& folder, const std::string& name, bool commander,
                         const std::string& public_z85, std::string& error);
[[nodiscard]] bool revoke(const std::string& folder, const std::string& name, std::string& error);

}  // namespace pastern::link
