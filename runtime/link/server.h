// The robot's end of the link: one thread, three ZeroMQ sockets, CURVE with an allow-list, the baton.
// A stop never waits for a disk or a computation: stop and halt are served in this thread through Line's
// atomics.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <string>

#include "pastern/v1/link.pb.h"

namespace pastern::link {

enum class Role : std::uint8_t { observer = 1, commander = 2 };

struct ServerConfig {
  std::string host{"127.0.0.1"};  ///< an address, or * for all; without keys anything but loopback is refused
  int command_port{7741};
  int telemetry_port{7742};
  int fetch_port{7743};
  std::string key_folder;            ///< empty: no CURVE, loopback only, whoever can connect commands
  std::int64_t baton_lapse_ms{500};  ///< 100 to 60 000
};

/// Who asked, as the session thread needs it to answer later.
struct Ticket {
  std::uint64_t number{0};
};

/// Who sent a command.
struct Asker {
  std::string who;  ///< for people: "ida (key tablet)"
  std::string key;  ///< public key, Z85: ids of commands are unique within it; empty without keys
};

/// What the server calls, from the link thread. Each returns at once and never touches a disk.
class Line {
 public:
  virtual ~Line() = default;
  virtual void stop() = 0;  ///< sets the cycle's atomic
  virtual void halt() = 0;
  [[nodiscard]] virtual bool stop_confirmed()
      const = 0;  ///< a damped or torque-free command has been written since
  virtual void baton_held(bool held) = 0;
  /// All other commands: queued for the session thread, which calls Server::answer. False when the queue is
  /// full.
  [[nodiscard]] virtual bool submit(Ticket ticket, const v1::Command& command, const Asker& asker) = 0;
  [[nodiscard]] virtual bool submit(Ticket ticket, const v1::Fetch& fetch) = 0;
  [[nodiscard]] virtual v1::Status status() const = 0;  ///< latest snapshot, a copy under a short lock
};

/// Where the sockets listen; as configured, or as the system chose for 0.
struct Ports {
  int command{0};
  int telemetry{0};
  int fetch{0};
};

/// Threads: the link thread (all sockets, Line's methods), with keys one more that reads the list of keys
/// once a second, and ZeroMQ's own two. A revoked key is refused from then on although its connection is up,
/// and telemetry's connections are made anew so that it cannot listen on. With keys whoever is on the list
/// may fetch and listen; who may command: runtime/link/desk.h.
class Server {
 public:
  /// Binds and starts the threads. Null with one line in `error`. Port 0 lets the system choose.
  [[nodiscard]] static std::unique_ptr<Server> start(const ServerConfig& config, Line& line,
                                                     std::string& error);
  ~Server();  ///< stops the threads; `line` is not called any more

  void answer(Ticket ticket, const v1::Answer& answer);    ///< any thread; an unknown ticket is ignored
  void answer(Ticket ticket, const v1::Fetched& fetched);  ///< any thread; an unknown ticket is ignored
  void publish(const v1::Telemetry& telemetry);    ///< any thread; dropped and counted when the queue is full
  [[nodiscard]] std::string baton_holder() const;  ///< any thread; empty when nobody holds it
  [[nodiscard]] std::uint64_t dropped() const;     ///< telemetry and answers that found the queue full
  [[nodiscard]] Ports ports() const;

 private:
  Server();
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::link
