// See scripted_robot.h.
#include "tests/tools/scripted_robot.h"

#include <gtest/gtest.h>

#include <random>

namespace pastern::testing {
namespace {

int random_port() {
  static std::mt19937 random(std::random_device{}());
  return std::uniform_int_distribution<int>(20000, 32000)(random);
}

}  // namespace

ScriptedRobot::ScriptedRobot() {
  status_.set_robot("tern8");
  status_.set_robot_sha256_hex(std::string(64, 'a'));
  status_.set_policy_sha256_hex(std::string(64, 'b'));
  status_.set_robot_state(v1::PARKED);
  status_.set_simulated(true);
  status_.set_pace("stepped");
  std::string error = "not tried";
  for (int tries = 0; tries < 50 && !server_; ++tries) {
    link::ServerConfig config;
    config.command_port = port_ = random_port();
    config.telemetry_port = port_ + 1;
    config.fetch_port = port_ + 2;
    server_ = link::Server::start(config, *this, error);
  }
  EXPECT_NE(server_, nullptr) << error;
}

ScriptedRobot::~ScriptedRobot() { server_.reset(); }

std::vector<std::string> ScriptedRobot::with(std::vector<std::string> words) const {
  for (const std::string& word :
       {std::string("--port"), std::to_string(port_), std::string("--keys"), std::string()}) {
    words.push_back(word);
  }
  return words;
}

void ScriptedRobot::set_status(const v1::Status& status) {
  const std::lock_guard<std::mutex> lock(mutex_);
  status_ = status;
}

void ScriptedRobot::publish(const v1::Telemetry& telemetry) { server_->publish(telemetry); }

std::vector<v1::Command> ScriptedRobot::taken() const {
  const std::lock_guard<std::mutex> lock(mutex_);
  return taken_;
}

bool ScriptedRobot::submit(link::Ticket ticket, const v1::Command& command, const link::Asker&) {
  {
    const std::lock_guard<std::mutex> lock(mutex_);
    taken_.push_back(command);
  }
  v1::Answer answer;
  answer.set_accepted(true);
  if (script) answer = script(command);
  answer.set_id(command.id());
  server_->answer(ticket, answer);
  return true;
}

bool ScriptedRobot::submit(link::Ticket ticket, const v1::Fetch& fetch) {
  server_->answer(ticket, fetch_script ? fetch_script(fetch) : v1::Fetched{});
  return true;
}

v1::Status ScriptedRobot::status() const {
  const std::lock_guard<std::mutex> lock(mutex_);
  return status_;
}

int silent_port() {
  // Below what random_port() and the system give out; nothing of ours listens there.
  return 19370;
}

}  // namespace pastern::testing
