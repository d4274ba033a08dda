// The session thread's loop: serves commands and fetches, runs sessions, publishes. Everything here may take
// its time; what must not (stop, halt, the baton) is served by the link thread through Exchange.
#pragma once

#include <atomic>
#include <chrono>
#include <cstdint>
#include <optional>
#include <string>

#include "pastern/v1/link.pb.h"
#include "proto/files/policy_file.h"
#include "proto/files/robot_file.h"
#include "runtime/journal/journal.h"
#include "runtime/link/server.h"
#include "runtime/onboard/exchange.h"
#include "runtime/session/runner.h"

namespace pastern::onboard {

/// Set by signal handlers.
struct Leaving {
  std::atomic<bool> asked{false};
};

class Program final : public session::Hooks {
 public:
  struct Parts {
    const files::RobotFile& robot;
    files::PolicyFile policy;  ///< current: the adopted one, or the one given
    std::string journal_folder;
    session::Mover& mover;
    journal::Journal& journal;
    Exchange& exchange;
    const Leaving& leaving;
    std::string drives{};           ///< what the plug-in calls itself
    std::string drives_settings{};  ///< as they were given, and what the plug-in said about itself
  };
  explicit Program(Parts parts);

  /// Why the program cannot serve (the simulated robot's carried state does not fit); empty when it can.
  [[nodiscard]] const std::string& trouble() const { return runner_.restore_failure(); }
  void connect(link::Server& server) { server_ = &server; }
  /// Until SIGTERM or SIGINT.
  void run();

  // Hooks.
  void serve() override;
  bool wait(const std::string& what) override;
  bool leave() override { return parts_.leaving.asked.load(std::memory_order_acquire); }
  void on_begun(std::uint64_t session) override;
  void on_episode(const v1::Episode& episode) override;
  void on_verdict(const v1::Verdict& verdict) override;
  void on_note(const std::string& words) override;

 private:
  struct Job {
    enum class Kind : std::uint8_t { none, session, resume, walk };
    Kind kind{Kind::none};
    std::optional<session::SessionSetup> setup;
    double duration_s{0};
    std::uint64_t draw{0};
    std::string who;
  };

  void rest_when_asked();
  void show_status(bool to_all);
  void do_job();
  void tell_other_drives();
  [[nodiscard]] v1::Telemetry numbered();
  void publish(const v1::Telemetry& telemetry, bool kept);
  void publish_missed();
  [[nodiscard]] bool busy() const { return running_ || job_.kind != Job::Kind::none; }

  // commands.cpp
  void answer(const Asked& asked, const v1::Command& command);
  [[nodiscard]] v1::Answer act(const v1::Command& command, const Asked& asked);
  [[nodiscard]] v1::Answer start_session(const v1::StartSession& start, const std::string& who);
  [[nodiscard]] v1::Answer go();
  [[nodiscard]] v1::Answer walk(const v1::Walk& walk);
  [[nodiscard]] v1::Answer mark_void(const v1::MarkVoid& mark);
  [[nodiscard]] v1::Answer release(std::uint64_t stops_seen);
  [[nodiscard]] v1::Answer resume();
  [[nodiscard]] v1::Answer park();
  [[nodiscard]] v1::Answer adopt(const v1::Adopt& adopt, const std::string& who);
  [[nodiscard]] v1::Answer confirm(const v1::ConfirmFirstStart& confirm, const std::string& who);
  [[nodiscard]] v1::Answer end_session(const std::string& who);
  [[nodiscard]] std::optional<std::string> proposed_sha(std::string& words) const;

  // fetches.cpp
  void answer(const Asked& asked, const v1::Fetch& fetch);
  [[nodiscard]] v1::Fetched fetched(const v1::FetchTelemetry& fetch) const;
  [[nodiscard]] v1::Fetched fetched(const v1::FetchJournal& fetch);
  [[nodiscard]] v1::Fetched fetched(const v1::FetchPolicy& fetch) const;

  Parts parts_;
  session::Runner runner_;
  link::Server* server_{nullptr};
  Job job_;
  bool running_{false};
  std::string begun_by_;  ///< who asked for the session that runs
  std::uint64_t sequence_{0};
  std::uint64_t reserved_{0};
  std::string snapshot_;  // of the journal, while it is fetched in pieces
  std::chrono::steady_clock::time_point shown_;
};

/// UTC, "2026-01-31T12:00:00Z".
[[nodiscard]] std::string now_utc();

}  // namespace pastern::onboard
