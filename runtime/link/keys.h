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

/// Each: false with one line in `error` (file, found, expected). Nothing half-written, nothing overwritten.
/// Names are 1 to 32 letters, digits, - or _. A robot's folder that others can write to is refused.
[[nodiscard]] bool make_pair(const std::string& folder, const std::string& name, std::string& error);
[[nodiscard]] bool read_robot_keys(const std::string& folder, RobotKeys& keys, std::string& error);
[[nodiscard]] bool read_ground_keys(const std::string& folder, GroundKeys& keys, std::string& error);
/// The robot's list as far as it can be read, added to `allowed`; one line for each file that is no key, or
/// whose key or name is there twice. A robot does not start with such a list; one that runs goes on without.
std::vector<std::string> read_allowed(const std::string& folder, std::vector<AllowedKey>& allowed);
/// Refused when the name or the key is listed already: revoke first.
[[nodiscard]] bool allow(const std::string& folder, const std::string& name, bool commander,
                         const std::string& public_z85, std::string& error);
[[nodiscard]] bool revoke(const std::string& folder, const std::string& name, std::string& error);

}  // namespace pastern::link
