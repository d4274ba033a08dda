// A robot's end and its key folders for tests: everything in a temporary folder, on ports the system chose.
#pragma once

#include <gtest/gtest.h>
#include <stdlib.h>

#include <chrono>
#include <filesystem>
#include <functional>
#include <memory>
#include <string>
#include <thread>

#include "runtime/link/client.h"
#include "runtime/link/keys.h"
#include "runtime/link/server.h"
#include "tests/runtime/link/scripted_line.h"

namespace pastern::link::testing {

class Folder {
 public:
  Folder() {
    std::string pattern = (std::filesystem::temp_directory_path() / "pastern-link-XXXXXX").string();
    if (::mkdtemp(pattern.data()) != nullptr) path_ = pattern;
  }
  ~Folder() {
    std::error_code ignored;
    if (!path_.empty()) std::filesystem::remove_all(path_, ignored);
  }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  [[nodiscard]] const std::string& path() const { return path_; }

 private:
  std::string path_;
};

/// Waits until it is true; false after ten seconds, which is no timing assertion but an end to waiting.
inline bool eventually(const std::function<bool()>& is_true) {
  for (int i = 0; i < 10'000; ++i) {
    if (is_true()) return true;
    std::this_thread::sleep_for(std::chrono::milliseconds(1));
  }
  return false;
}

class Site {
 public:
  explicit Site(bool guarded, std::int64_t lapse_ms = 500) : guarded_(guarded), lapse_ms_(lapse_ms) {
    if (guarded_) {
      std::string error;
      EXPECT_TRUE(make_pair(robot_keys(), "robot", error)) << error;
      std::filesystem::create_directory(robot_keys() + "/allowed");
    }
  }

  void start() {
    ServerConfig config;
    config.command_port = ports.command;
    config.telemetry_port = ports.telemetry;
    config.fetch_port = ports.fetch;
    config.baton_lapse_ms = lapse_ms_;
    if (guarded_) config.key_folder = robot_keys();
    std::string error;
    // A port that was in use a moment ago may need that moment.
    (void)eventually([&] { return (server = Server::start(config, line, error)) != nullptr; });
    ASSERT_NE(server, nullptr) << error;
    ports = server->ports();
    line.server = server.get();
  }
  void end() {
    line.server = nullptr;
    server.reset();
  }

  /// A ground tool's folder with a pair of its own and this robot's public key, on the list or not.
  std::string ground(const std::string& name, bool listed, bool commander) {
    const std::string folder = folder_.path() + "/ground-" + name;
    std::string error;
    EXPECT_TRUE(make_pair(folder, name, error)) << error;
    std::filesystem::copy_file(robot_keys() + "/robot.public", folder + "/robot.public");
    EXPECT_TRUE(!listed || allow(robot_keys(), name, commander, key_of(name), error)) << error;
    return folder;
  }
  [[nodiscard]] std::string key_of(const std::string& name) const {
    GroundKeys keys;
    std::string error;
    EXPECT_TRUE(read_ground_keys(folder_.path() + "/ground-" + name, keys, error)) << error;
    return keys.public_z85;
  }

  [[nodiscard]] ClientConfig config_of(const std::string& key_folder = {}) const {
    ClientConfig config;
    config.command_port = ports.command;
    config.telemetry_port = ports.telemetry;
    config.fetch_port = ports.fetch;
    config.key_folder = key_folder;
    return config;
  }
  [[nodiscard]] std::unique_ptr<Client> client(const std::string& key_folder = {}) const {
    std::string error;
    std::unique_ptr<Client> client = Client::connect(config_of(key_folder), error);
    EXPECT_NE(client, nullptr) << error;
    return client;
  }

  [[nodiscard]] std::string robot_keys() const { return folder_.path() + "/robot"; }
  [[nodiscard]] const std::string& path() const { return folder_.path(); }

  ScriptedLine line;
  std::unique_ptr<Server> server;
  Ports ports;

 private:
  Folder folder_;
  bool guarded_;
  std::int64_t lapse_ms_;
};

/// A command of each kind, by the name of its field.
inline v1::Command command_named(const std::string& field) {
  v1::Command command;
  const auto* descriptor = v1::Command::descriptor()->FindFieldByName(field);
  EXPECT_NE(descriptor, nullptr) << field;
  if (descriptor != nullptr) (void)command.GetReflection()->MutableMessage(&command, descriptor);
  return command;
}

inline std::vector<std::string> command_names() {
  std::vector<std::string> names;
  const auto* what = v1::Command::descriptor()->FindOneofByName("what");
  for (int i = 0; i < what->field_count(); ++i) names.push_back(what->field(i)->name());
  return names;
}

}  // namespace pastern::link::testing
