// The robot's end of the simulated drive bus.
#include "hal_stub/process/bus_server.h"

#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstring>

#include "hal_stub/plugin/frame.h"

namespace pastern::stub {
namespace {

/// True when `path` is a socket that nobody listens on.
bool is_left_over(const sockaddr_un& address, const char* path) {
  struct stat status {};
  if (::stat(path, &status) != 0 || !S_ISSOCK(status.st_mode)) return false;
  const int probe = ::socket(AF_UNIX, SOCK_DGRAM | SOCK_CLOEXEC, 0);
  const int failed = ::connect(probe, reinterpret_cast<const sockaddr*>(&address), sizeof address);
  const int reason = errno;
  ::close(probe);
  return failed != 0 && reason == ECONNREFUSED;
}

bool same_peer(const sockaddr_un& a, socklen_t a_size, const sockaddr_un& b, socklen_t b_size) {
  return a_size == b_size && std::memcmp(&a, &b, a_size) == 0;
}

}  // namespace

BusServer::~BusServer() {
  if (socket_ < 0) return;
  ::close(socket_);
  ::unlink(path_.c_str());
}

bool BusServer::listen_at(const std::string& path, std::string& error) {
  sockaddr_un address{};
  if (!socket_address(path, address, error)) return false;
  if (is_left_over(address, path.c_str())) ::unlink(path.c_str());
  const int made = ::socket(AF_UNIX, SOCK_DGRAM | SOCK_NONBLOCK | SOCK_CLOEXEC, 0);
  const mode_t before = ::umask(0077);  // only this user may move the robot
  const bool bound =
      made >= 0 && ::bind(made, reinterpret_cast<const sockaddr*>(&address), sizeof address) == 0;
  const int reason = errno;
  ::umask(before);
  if (!bound) {
    if (made >= 0) ::close(made);
    error = "socket " + path + ": " + std::strerror(reason);
    return false;
  }
  socket_ = made;
  path_ = path;
  return true;
}

void BusServer::answer(BusKind kind, const std::string& text, const sockaddr_un& to, socklen_t to_size) {
  BusLine line;
  line.head.kind = kind;
  line.head.joint_count = static_cast<std::uint32_t>(robot_.model().joint_count());
  text.copy(line.text, sizeof line.text - 1);
  (void)::sendto(socket_, &line, sizeof line, MSG_DONTWAIT | MSG_NOSIGNAL,
                 reinterpret_cast<const sockaddr*>(&to), to_size);
}

void BusServer::welcome(const BusHello& hello, const sockaddr_un& from, socklen_t from_size) {
  const auto joints = static_cast<std::uint32_t>(robot_.model().joint_count());
  const double off = hello.period_s - robot_.model().period_s();
  if (hello.head.joint_count != joints || !(off < 1e-9 && off > -1e-9)) {
    answer(BusKind::refuse,
           "found " + std::to_string(hello.head.joint_count) + " joints and a period of " +
               std::to_string(hello.period_s) + " s, expected " + std::to_string(joints) + " and " +
               std::to_string(robot_.model().period_s()),
           from, from_size);
    return;
  }
  peer_ = from;
  peer_size_ = from_size;
  answer(BusKind::welcome, "", from, from_size);
}

void BusServer::take_one(const char* data, std::size_t size, const sockaddr_un& from, socklen_t from_size) {
  if (is_bus_message<BusHello>(data, size, BusKind::hello)) {
    BusHello hello;
    std::memcpy(&hello, data, sizeof hello);
    welcome(hello, from, from_size);
    return;
  }
  if (!same_peer(from, from_size, peer_, peer_size_))
    return;  // only the one that was welcomed last moves the robot
  if (is_bus_message<BusCommand>(data, size, BusKind::command)) {
    BusCommand command;
    std::memcpy(&command, data, sizeof command);
    robot_.command(torques_of(command.command), command.command.torque_on != 0);
    ++commands_;
  }
  if (is_bus_message<BusCarry>(data, size, BusKind::carry)) {
    BusCarry carry;
    std::memcpy(&carry, data, sizeof carry);
    robot_.place_lying(carry.draw);
    answer(BusKind::carried, "", from, from_size);
  }
}

void BusServer::take_messages() {
  alignas(8) char buffer[4096];
  for (;;) {
    sockaddr_un from{};
    socklen_t from_size = sizeof from;
    const auto got = ::recvfrom(socket_, buffer, sizeof buffer, MSG_DONTWAIT,
                                reinterpret_cast<sockaddr*>(&from), &from_size);
    if (got < 0) return;
    if (got >= static_cast<ssize_t>(sizeof(BusHead)))
      take_one(buffer, static_cast<std::size_t>(got), from, from_size);
  }
}

void BusServer::send_frame(std::int64_t now_ns) {
  if (peer_size_ == 0) return;
  BusFrame message;
  message.head.kind = BusKind::frame;
  message.head.joint_count = static_cast<std::uint32_t>(robot_.model().joint_count());
  message.broken = robot_.bus_sound() ? 0 : 1;
  if (robot_.read(frame_)) {
    fill_frame(frame_, message.frame);
    message.frame.time_ns = now_ns;
  } else {
    message.none = 1;
  }
  const auto sent = ::sendto(socket_, &message, sizeof message, MSG_DONTWAIT | MSG_NOSIGNAL,
                             reinterpret_cast<const sockaddr*>(&peer_), peer_size_);
  if (sent < 0 && (errno == ECONNREFUSED || errno == ENOENT))
    peer_size_ = 0;  // it has gone; the drives time out
}

}  // namespace pastern::stub
