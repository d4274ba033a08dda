// One question, one answer over a DEALER socket, asked again on a new connection while time is left, with a
// reason in words when nothing came. One thread.
#pragma once

#include <functional>
#include <memory>
#include <optional>
#include <string>

#include "runtime/link/client.h"
#include "runtime/link/keys.h"
#include "runtime/link/wire.h"

namespace pastern::link {

/// What all sockets of one client share.
struct Dial {
  std::string host;
  std::optional<GroundKeys> keys;
  std::string key_folder;
  wire::Context context;

  /// A socket that connects to the port; not open with one line in `error`.
  [[nodiscard]] wire::Socket socket(int type, int port, std::string& error);
  /// Guarded like all others, but not connected yet.
  [[nodiscard]] wire::Socket bare(int type, std::string& error);
};

class Caller {
 public:
  Caller(Dial& dial, int port) : dial_(dial), port_(port) {}
  ~Caller() { hang_up(); }
  Caller(const Caller&) = delete;
  Caller& operator=(const Caller&) = delete;

  /// `is_answer` judges what comes in; what it turns down is thrown away. A key that the robot turns down
  /// ends the waiting early unless `stubborn`.
  [[nodiscard]] bool exchange(const std::string& question, int timeout_ms, int again_ms, bool stubborn,
                              const std::function<bool(const std::string&)>& is_answer);
  /// Sends without waiting for anything; false when the connection cannot take it.
  bool tell(const std::string& message);
  /// Next message that came in, without waiting.
  [[nodiscard]] std::optional<std::string> heard();
  /// Forgets the connection: the next message goes over a new one.
  void hang_up();
  [[nodiscard]] const std::string& trouble() const { return trouble_; }

 private:
  [[nodiscard]] bool open(bool watched);
  void watch_events();
  void stop_watching();
  void say_why(int timeout_ms);
  [[nodiscard]] bool wait_for_answer(std::int64_t until_ns, bool stubborn,
                                     const std::function<bool(const std::string&)>& is_answer);

  Dial& dial_;
  int port_;
  wire::Socket socket_;
  wire::Socket events_;
  bool connected_{false};     ///< a TCP connection came up
  bool shaken_{false};        ///< the handshake succeeded
  bool key_refused_{false};   ///< the robot said that our key is not on its list
  bool shake_failed_{false};  ///< the handshake failed otherwise
  std::string trouble_;
};

}  // namespace pastern::link
