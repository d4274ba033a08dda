// The onboard program as a child process, its output and a client on its ports.
#pragma once

#include <sys/types.h>

#include <functional>
#include <memory>
#include <string>
#include <vector>

#include "runtime/link/client.h"
#include "tests/runtime/session/setting.h"

namespace pastern::test {

struct Ran {
  int status{-1};  ///< exit status, or 128 + signal
  std::string output;
};

/// Runs the program to its end with these arguments.
[[nodiscard]] Ran run_onboard(const std::vector<std::string>& arguments);

/// Robot and policy file on disk, a journal folder, the program on the puppet.
class Onboard {
 public:
  explicit Onboard(const std::string& pace = "stepped");
  ~Onboard();
  Onboard(const Onboard&) = delete;
  Onboard& operator=(const Onboard&) = delete;

  /// Starts the program and a client; false when it did not say "ready".
  [[nodiscard]] bool start(const std::vector<std::string>& more = {});
  /// Sends the signal and does not wait.
  void send(int signal) const;
  /// Sends the signal and waits for the end; exit status, or 128 + signal.
  int end(int signal);

  [[nodiscard]] link::Client& client() { return *client_; }
  [[nodiscard]] const files::RobotFile& robot() const { return robot_; }
  [[nodiscard]] const std::string& policy_sha() const { return policy_sha_; }
  [[nodiscard]] const std::string& journal_folder() const { return journal_; }
  [[nodiscard]] std::vector<std::string> arguments() const;
  [[nodiscard]] const std::string& output() const { return output_; }

  // Short cuts; each fails the test when nothing was answered.
  v1::Answer ask(const v1::Command& command);
  v1::Status status();
  bool take_baton();
  v1::Answer confirm();
  v1::Answer start_session(const v1::Plan& plan);
  /// Until the status fits or 60 s have gone; false then.
  bool wait_until(const std::function<bool(const v1::Status&)>& fits);
  /// The session's digest, read from the journal when the program has ended.
  [[nodiscard]] std::string digest() const;

 private:
  TestFolder folder_;
  std::string pace_;
  std::string journal_;
  std::string policy_path_;
  std::string policy_sha_;
  std::string options_;
  files::RobotFile robot_;
  pid_t process_{-1};
  int pipe_{-1};
  std::string output_;
  std::unique_ptr<link::Client> client_;
};

}  // namespace pastern::test
