// Wall pace: client of the simulated drive bus. read and write never wait; only hello and carry_back do.
#include <poll.h>
#include <unistd.h>

#include <cerrno>
#include <chrono>
#include <cstdio>
#include <cstring>

#include "hal_stub/plugin/bus.h"
#include "hal_stub/plugin/port.h"

namespace pastern::stub {
namespace {

constexpr int kAnswerMilliseconds =
    1000;  // the robot's process answers within a tick, but the machine may stall
constexpr char kOutlives[] = "wall pace: the robot keeps its own state";

class BusPort final : public Port {
 public:
  explicit BusPort(std::uint32_t joint_count) { head_.joint_count = joint_count; }
  ~BusPort() override {
    if (socket_ >= 0) ::close(socket_);
  }

  bool connect_to(const std::string& path, double period_s, std::string& error) {
    sockaddr_un address{};
    if (!socket_address(path, address, error)) return false;
    socket_ = ::socket(AF_UNIX, SOCK_DGRAM | SOCK_NONBLOCK | SOCK_CLOEXEC, 0);
    const sockaddr_un nameless{AF_UNIX, {}};  // the kernel gives this end a name of its own
    if (socket_ < 0 ||
        ::bind(socket_, reinterpret_cast<const sockaddr*>(&nameless), sizeof(sa_family_t)) != 0 ||
        ::connect(socket_, reinterpret_cast<const sockaddr*>(&address), sizeof address) != 0) {
      error = "socket " + path + ": " + std::strerror(errno) + ", expected a running pastern-stub-robot";
      return false;
    }
    BusHello hello{head_, period_s};
    hello.head.kind = BusKind::hello;
    if (!ask(&hello, sizeof hello, BusKind::welcome)) {
      error = "socket " + path + ": " + line_;
      return false;
    }
    return true;
  }

  int read(pastern_hal_frame& frame) override {
    bool fresh = false;
    while (take() == sizeof(BusFrame)) {
      if (!is_bus_message<BusFrame>(buffer_, sizeof(BusFrame), BusKind::frame)) continue;
      std::memcpy(&newest_, buffer_, sizeof newest_);
      fresh = true;
    }
    if (dead_) return fail("the robot's process has gone");
    if (!fresh) return PASTERN_HAL_NO_FRAME;
    if (newest_.broken != 0) return fail("bus broken (a fault of the scenario)");
    if (newest_.none != 0) return PASTERN_HAL_NO_FRAME;
    const std::uint32_t size = frame.struct_size;
    frame = newest_.frame;
    frame.struct_size = size;
    return PASTERN_HAL_OK;
  }

  int write(const pastern_hal_command& command) override {
    BusCommand message{head_, command};
    message.head.kind = BusKind::command;
    const auto sent = ::send(socket_, &message, sizeof message, MSG_DONTWAIT | MSG_NOSIGNAL);
    if (sent == static_cast<ssize_t>(sizeof message))
      return newest_.broken != 0 ? PASTERN_HAL_FAILED : PASTERN_HAL_OK;
    // A full queue means that the robot's process does not run now: the command is lost, as on a real bus.
    return fail(errno == EAGAIN ? "the robot takes no more commands" : "the robot's process has gone");
  }

  bool save(std::string& state) override {
    state = kOutlives;
    return true;
  }
  bool restore(const std::string& state) override {
    if (state == kOutlives) return true;
    fail("saved state: found that of a robot at stepped pace, expected one at wall pace");
    return false;
  }

  bool carry_back(std::uint64_t draw) override {
    BusCarry message{head_, draw};
    message.head.kind = BusKind::carry;
    return ask(&message, sizeof message, BusKind::carried);
  }

  const char* error_text() const override { return line_; }

 private:
  int fail(const char* line) {
    std::snprintf(line_, sizeof line_, "%s", line);
    return PASTERN_HAL_FAILED;
  }

  /// Bytes of the next datagram in buffer_, or -1 when there is none.
  ssize_t take() {
    const auto got = ::recv(socket_, buffer_, sizeof buffer_, MSG_DONTWAIT);
    dead_ = got < 0 && errno != EAGAIN && errno != EWOULDBLOCK && errno != EINTR;
    return got;
  }

  /// Sends and waits for an answer of `kind`; frames that come between are dropped.
  bool ask(const void* message, std::size_t size, BusKind kind) {
    using Clock = std::chrono::steady_clock;
    const auto end = Clock::now() + std::chrono::milliseconds(kAnswerMilliseconds);
    if (::send(socket_, message, size, MSG_NOSIGNAL) != static_cast<ssize_t>(size)) {
      fail(std::strerror(errno));
      return false;
    }
    while (Clock::now() < end) {
      pollfd wait{socket_, POLLIN, 0};
      (void)::poll(&wait, 1, 10);
      const ssize_t got = take();
      if (got < static_cast<ssize_t>(sizeof(BusHead))) continue;
      if (is_bus_message<BusLine>(buffer_, static_cast<std::size_t>(got), BusKind::refuse)) {
        BusLine refusal{};
        std::memcpy(&refusal, buffer_, sizeof refusal);
        refusal.text[sizeof refusal.text - 1] = 0;
        fail(refusal.text);
        return false;
      }
      if (is_bus_message<BusLine>(buffer_, static_cast<std::size_t>(got), kind)) return true;
    }
    fail("no answer within 1 s, expected one of pastern-stub-robot");
    return false;
  }

  int socket_{-1};
  BusHead head_;
  BusFrame newest_;
  bool dead_{false};
  char line_[200]{};
  alignas(8) char buffer_[4096]{};
};

}  // namespace

std::unique_ptr<Port> bus_port(const pastern_hal_config& config, const std::string& socket,
                               std::string& error) {
  auto port = std::make_unique<BusPort>(config.joint_count);
  if (!port->connect_to(socket, config.period_s, error)) return nullptr;
  return port;
}

}  // namespace pastern::stub
