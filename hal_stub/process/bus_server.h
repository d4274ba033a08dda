// The robot's end of the simulated drive bus: takes commands, sends frames, puts the robot back when asked.
#pragma once

#include <sys/un.h>

#include <cstdint>
#include <string>

#include "hal_stub/plugin/bus.h"
#include "hal_stub/robot/simulated_robot.h"

namespace pastern::stub {

class BusServer {
 public:
  explicit BusServer(SimulatedRobot& robot) : robot_(robot) {}
  ~BusServer();
  BusServer(const BusServer&) = delete;
  BusServer& operator=(const BusServer&) = delete;

  /// Makes the socket. A socket file that nobody listens on is replaced; one that is in use is not. False
  /// with a line.
  [[nodiscard]] bool listen_at(const std::string& path, std::string& error);
  /// Everything that has come since the last call; the newest command wins. Never waits.
  void take_messages();
  /// The newest frame to whoever said hello last, stamped with `now_ns` of CLOCK_MONOTONIC.
  void send_frame(std::int64_t now_ns);
  [[nodiscard]] std::uint64_t commands() const { return commands_; }

 private:
  void take_one(const char* data, std::size_t size, const sockaddr_un& from, socklen_t from_size);
  void welcome(const BusHello& hello, const sockaddr_un& from, socklen_t from_size);
  void answer(BusKind kind, const std::string& text, const sockaddr_un& to, socklen_t to_size);

  SimulatedRobot& robot_;
  int socket_{-1};
  std::string path_;
  sockaddr_un peer_{};
  socklen_t peer_size_{0};  ///< 0: nobody has said hello
  std::uint64_t commands_{0};
  safety::SensorFrame frame_;
};

}  // namespace pastern::stub
