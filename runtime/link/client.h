// The ground's end of the link. One thread at a time.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>

#include "pastern/v1/link.pb.h"

namespace pastern::link {

struct ClientConfig {
  std::string host{"127.0.0.1"};
  int command_port{7741};
  int telemetry_port{7742};
  int fetch_port{7743};
  std::string key_folder;  ///< empty: no CURVE
  std::string operator_name{"operator"};
};

/// A robot that does not answer costs the time given and nothing more; trouble() says why in one line.
class Client {
 public:
  /// Reads the keys and makes the sockets; null with one line in `error`. Does not wait for the robot:
  /// whether it is there shows with the first question.
  [[nodiscard]] static std::unique_ptr<Client> connect(const ClientConfig& config, std::string& error);
  ~Client();  ///< does not give the baton back: it lapses

  /// Fills in format, id (when empty), name and baton (when 0); sends; waits; sends again with the same id,
  /// on a new connection, after a third of the time (stop and halt: after 250 ms at the latest). Nothing when
  /// no answer came within `timeout_ms`.
  [[nodiscard]] std::optional<v1::Answer> ask(v1::Command command, int timeout_ms = 3000);
  [[nodiscard]] std::optional<v1::Fetched> fetch(const v1::Fetch& fetch, int timeout_ms = 5000);
  /// Next telemetry, or nothing within the time. A gap in the sequence is filled by fetching before later
  /// ones are given; what the robot does not keep (status, notes) stays missing. A sequence that starts again
  /// lower is a robot that was started again.
  [[nodiscard]] std::optional<v1::Telemetry> next(int timeout_ms);
  /// next() is to begin with this sequence number, fetching it if need be. Without it next() begins after the
  /// last_sequence of the first status asked for, or with whatever comes first.
  void listen_from(std::uint64_t sequence);
  /// Takes the baton and renews it every 100 ms from a thread of its own until given back or destroyed. False
  /// with one line in `why`. The thread renews as long as the process lives: a screen that hangs does not let
  /// go of the baton, a process that dies does.
  [[nodiscard]] bool take_baton(std::string& why);
  void give_baton();
  /// Number of the baton held, 0 without one: another process with the same key may command with it.
  /// Becomes 0 when the robot says that it has lapsed.
  [[nodiscard]] std::uint64_t baton() const;
  /// Why the last ask or fetch brought nothing: one line for people.
  [[nodiscard]] const std::string& trouble() const;

 private:
  Client();
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::link
