// A robot that exists only as the far end of the link: the real server, answers from a script.
#pragma once

#include <atomic>
#include <functional>
#include <memory>
#include <mutex>
#include <string>
#include <vector>

#include "pastern/v1/link.pb.h"
#include "runtime/link/server.h"

namespace pastern::testing {

class ScriptedRobot final : public link::Line {
 public:
  using Script = std::function<v1::Answer(const v1::Command&)>;
  using FetchScript = std::function<v1::Fetched(const v1::Fetch&)>;

  /// Listens on three neighbouring ports of loopback.
  ScriptedRobot();
  ~ScriptedRobot() override;

  /// `words` and where this robot listens.
  [[nodiscard]] std::vector<std::string> with(std::vector<std::string> words) const;

  /// What a command gets; accepted without words when not set.
  Script script;
  FetchScript fetch_script;
  std::atomic<bool> confirms{true};  ///< stop and halt take effect
  std::atomic<int> stops{0};
  std::atomic<int> halts{0};

  void set_status(const v1::Status& status);
  void publish(const v1::Telemetry& telemetry);
  /// Every command that reached the session thread's place, in order.
  [[nodiscard]] std::vector<v1::Command> taken() const;

  // link::Line, link thread.
  void stop() override { ++stops; }
  void halt() override { ++halts; }
  [[nodiscard]] bool stop_confirmed() const override { return confirms.load(); }
  void baton_held(bool) override {}
  [[nodiscard]] bool submit(link::Ticket ticket, const v1::Command& command,
                            const link::Asker& asker) override;
  [[nodiscard]] bool submit(link::Ticket ticket, const v1::Fetch& fetch) override;
  [[nodiscard]] v1::Status status() const override;

 private:
  mutable std::mutex mutex_;
  v1::Status status_;
  std::vector<v1::Command> taken_;
  std::unique_ptr<link::Server> server_;
  int port_{0};
};

/// A port of loopback, with its two neighbours, at which nobody listens.
[[nodiscard]] int silent_port();

}  // namespace pastern::testing
