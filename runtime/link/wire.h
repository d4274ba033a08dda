// ZeroMQ's C interface with owners: a context, a socket, whole messages in and out. Nothing here waits; a
// socket is used by one thread at a time (as ZeroMQ demands).
#pragma once

#include <zmq.h>

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

namespace pastern::link::wire {

/// Largest message that is taken from the other side. A candidate policy is the largest command, a piece of
/// the journal the largest answer.
inline constexpr std::int64_t kLargestCommand = 4 << 20;
inline constexpr std::int64_t kLargestFetch = 4 << 10;
inline constexpr std::int64_t kLargestAnswer = 32 << 20;

inline constexpr char kTopic[] = "telemetry";
inline constexpr char kDomain[] = "pastern";  ///< ZAP domain (RFC 27); not empty, so that it can be enforced

class Context {
 public:
  Context() : raw_(zmq_ctx_new()) {}
  ~Context();
  Context(const Context&) = delete;
  Context& operator=(const Context&) = delete;
  [[nodiscard]] void* raw() const { return raw_; }

 private:
  void* raw_;
};

/// Empty after a failed open or after close(). Lingers for nothing.
class Socket {
 public:
  Socket() = default;
  Socket(Context& context, int type);
  ~Socket() { close(); }
  Socket(Socket&& other) noexcept : raw_(other.raw_) { other.raw_ = nullptr; }
  Socket& operator=(Socket&& other) noexcept;
  void close();
  [[nodiscard]] void* raw() const { return raw_; }
  [[nodiscard]] bool open() const { return raw_ != nullptr; }

  [[nodiscard]] bool set(int option, int value);
  [[nodiscard]] bool set(int option, std::int64_t value);
  [[nodiscard]] bool set(int option, const std::string& value);
  /// Where a bound socket listens, e.g. "tcp://127.0.0.1:40123"; empty on failure.
  [[nodiscard]] std::string endpoint() const;

 private:
  void* raw_{nullptr};
};

/// One message as it came: the first frames up to `most`, the number of all of them, and the sender's ZAP
/// user id (empty without CURVE).
struct Incoming {
  std::vector<std::string> frames;
  std::size_t frame_count{0};
  std::string user;
};

/// False when nothing is waiting. Frames beyond `most` are read and thrown away.
[[nodiscard]] bool receive(Socket& socket, Incoming& incoming, std::size_t most);

/// All frames or nothing, never waiting; false when the other side cannot take it.
bool send(Socket& socket, const std::vector<std::string_view>& frames);

/// zmq_strerror of the last call in this thread.
[[nodiscard]] std::string last_error();

/// "tcp://host:port", an IPv6 address in brackets.
[[nodiscard]] std::string address(const std::string& host, int port);

/// 127.0.0.0/8, ::1 or "localhost", as literals: names are not looked up.
[[nodiscard]] bool is_loopback(const std::string& host);

/// From the system's random source.
[[nodiscard]] std::uint64_t random_u64();

/// CLOCK_MONOTONIC, nanoseconds.
[[nodiscard]] std::int64_t now_ns();

/// Protobuf writes a line to stderr for each message with damaged text. Whoever sends many would make the
/// link thread wait for a terminal or a disk: it stays silent, in the whole process; the answer says what is
/// wrong.
void silence_protobuf();

/// No signal is delivered to the calling thread: they belong to the main thread.
void block_signals();

}  // namespace pastern::link::wire
