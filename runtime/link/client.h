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

class Client {
 public:
  [[nodiscard]] static std::unique_ptr<Client> connect(const ClientConfig& config, std::string& error);
  ~Client();

  /// Fills in format, id (when empty), name and baton (when 0); sends; waits; sends again with the same id
  /// after a third of the time. Nothing when no answer came within `timeout_ms`.
  [[nodiscard]] std::optional<v1::Answer> ask(v1::Command command, int timeout_ms = 3000);
  [[nodiscard]] std::optional<v1::Fetched> fetch(const v1::Fetch& fetch, int timeout_ms = 5000);
  /// Next telemetry, or nothing within the time. A gap in the sequence is filled by fetching before later
  /// ones are given.
  [[nodiscard]] std::optional<v1::Telemetry> next(int timeout_ms);
  /// Takes the baton and renews it every 100 ms from a thread of its own until given back or destroyed.
  [[nodiscard]] bool take_baton(std::string& why);
  void give_baton();
  /// Number of the baton held, 0 without one: another process with the same key may command with it.
  [[nodiscard]] std::uint64_t baton() const;

 private:
  Client();
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::link
