// The simulated drive bus at wall pace: datagrams over a Unix-domain socket between the plug-in and
// pastern-stub-robot. One struct a datagram, as this machine writes it (both ends run on it and are built
// together; the head says so).
#pragma once

#include <sys/socket.h>
#include <sys/un.h>

#include <cstdint>
#include <string>

#include "runtime/hal/pastern_hal.h"

namespace pastern::stub {

inline constexpr std::uint32_t kBusMark = 0x50425553;  // "PBUS"
inline constexpr std::uint32_t kBusVersion = 1;

enum class BusKind : std::uint32_t {
  hello = 1,  ///< plug-in: joint_count and period; answered by welcome or refuse
  welcome = 2,
  refuse = 3,   ///< with a line of text
  command = 4,  ///< plug-in, every tick
  frame = 5,    ///< robot, every tick, to whoever said hello last
  carry = 6,    ///< plug-in: put the robot back on its mark; answered by carried
  carried = 7,
};

struct BusHead {
  std::uint32_t mark{kBusMark};
  std::uint32_t version{kBusVersion};
  BusKind kind{BusKind::hello};
  std::uint32_t joint_count{0};
};

struct BusHello {
  BusHead head;
  double period_s{0};
};
struct BusCommand {
  BusHead head;
  pastern_hal_command command{};
};
struct BusFrame {
  BusHead head;
  pastern_hal_frame frame{};
  std::uint32_t broken{0};  ///< 1: the scenario breaks the bus; the frame means nothing
  std::uint32_t none{0};    ///< 1: the frame is lost
};
struct BusCarry {
  BusHead head;
  std::uint64_t draw{0};
};
struct BusLine {
  BusHead head;
  char text[160]{};
};

/// False with a line when the path is empty or too long for a socket address.
[[nodiscard]] inline bool socket_address(const std::string& path, sockaddr_un& address, std::string& error) {
  address = {};
  address.sun_family = AF_UNIX;
  if (path.empty() || path.size() >= sizeof(address.sun_path)) {
    error = "socket: found a path of " + std::to_string(path.size()) + " characters, expected 1 to " +
            std::to_string(sizeof(address.sun_path) - 1);
    return false;
  }
  path.copy(address.sun_path, path.size());
  return true;
}

/// True when `size` bytes at `data` are a whole message of `kind`.
template <class Message>
[[nodiscard]] bool is_bus_message(const void* data, std::size_t size, BusKind kind) noexcept {
  const auto* head = static_cast<const BusHead*>(data);
  return size == sizeof(Message) && head->mark == kBusMark && head->version == kBusVersion &&
         head->kind == kind;
}

}  // namespace pastern::stub
