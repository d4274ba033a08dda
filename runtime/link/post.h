// The robot's sockets: bound, guarded, read and written. Link thread only once the server has started.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "runtime/link/allow_list.h"
#include "runtime/link/desk.h"
#include "runtime/link/server.h"
#include "runtime/link/wire.h"

namespace pastern::link {

class Post {
 public:
  /// `keys` is null without CURVE. Nothing with one line in `error`.
  [[nodiscard]] static std::unique_ptr<Post> bind(const ServerConfig& config, const RobotKeys* keys,
                                                  std::string& error);

  /// Sleeps until something came, `extra_fd` is readable, or the time is over; 0 looks and returns.
  void wait(int extra_fd, long timeout_ms);

  /// Answers ZAP requests (RFC 27): a key that is not on the list is turned away in the handshake.
  void admit(const Allowed& allowed);
  /// Who sent it, by the key that ZAP vouched for, judged against the list as it is now.
  [[nodiscard]] Sender sender(const std::string& user, const Allowed& allowed) const;
  /// At most `most` commands and about `most_bytes` of them.
  [[nodiscard]] std::vector<Mail> commands(const Allowed& allowed, std::size_t most, std::size_t most_bytes);
  [[nodiscard]] std::optional<Mail> fetch(const Allowed& allowed);

  void reply(const Route& route, const std::string& bytes) { send_to(command_, route, bytes); }
  void reply_fetch(const Route& route, const std::string& bytes) { send_to(fetch_, route, bytes); }
  void publish(const std::string& bytes);

  /// Ends all telemetry connections; who may still listen comes back by itself and fetches what was missed.
  void drop_listeners();
  [[nodiscard]] bool publishing() const { return telemetry_.open(); }
  /// Binds telemetry again after drop_listeners(); the port is free only some moments later.
  void publish_again();

  [[nodiscard]] Ports ports() const { return ports_; }

 private:
  Post() = default;
  [[nodiscard]] wire::Socket made(int type, std::int64_t largest);
  [[nodiscard]] bool bound(wire::Socket& socket, int type, std::int64_t largest, int& port,
                           std::string& error);
  void send_to(wire::Socket& socket, const Route& route, const std::string& bytes);
  [[nodiscard]] Mail mail(wire::Incoming& incoming, const Allowed& allowed) const;

  wire::Context context_;
  wire::Socket zap_;
  wire::Socket command_;
  wire::Socket telemetry_;
  wire::Socket fetch_;
  std::string host_;
  std::string secret_;  ///< empty: no CURVE
  Ports ports_;
};

}  // namespace pastern::link
