// ZeroMQ's C interface with owners.
#include "runtime/link/wire.h"

#include <arpa/inet.h>
#include <google/protobuf/stubs/logging.h>
#include <signal.h>

#include <array>
#include <cerrno>
#include <chrono>
#include <mutex>
#include <random>

namespace pastern::link::wire {

Context::~Context() {
  // Interrupted by a signal: again, or the thread behind it would outlive us.
  while (zmq_ctx_term(raw_) != 0 && errno == EINTR) {
  }
}

Socket::Socket(Context& context, int type) : raw_(zmq_socket(context.raw(), type)) {
  if (raw_ != nullptr && !set(ZMQ_LINGER, 0)) close();
}

Socket& Socket::operator=(Socket&& other) noexcept {
  if (this != &other) {
    close();
    raw_ = other.raw_;
    other.raw_ = nullptr;
  }
  return *this;
}

void Socket::close() {
  if (raw_ != nullptr) zmq_close(raw_);
  raw_ = nullptr;
}

bool Socket::set(int option, int value) { return zmq_setsockopt(raw_, option, &value, sizeof value) == 0; }

bool Socket::set(int option, std::int64_t value) {
  return zmq_setsockopt(raw_, option, &value, sizeof value) == 0;
}

bool Socket::set(int option, const std::string& value) {
  return zmq_setsockopt(raw_, option, value.data(), value.size()) == 0;
}

std::string Socket::endpoint() const {
  std::array<char, 256> text{};
  std::size_t size = text.size();
  if (zmq_getsockopt(raw_, ZMQ_LAST_ENDPOINT, text.data(), &size) != 0 || size == 0) return {};
  return std::string(text.data(), size - 1);
}

bool receive(Socket& socket, Incoming& incoming, std::size_t most) {
  incoming.frames.clear();
  incoming.frame_count = 0;
  incoming.user.clear();
  bool more = true;
  while (more) {
    zmq_msg_t part;
    zmq_msg_init(&part);
    if (zmq_msg_recv(&part, socket.raw(), ZMQ_DONTWAIT) < 0) {
      zmq_msg_close(&part);
      return false;
    }
    more = zmq_msg_more(&part) != 0;
    if (incoming.frames.size() < most) {
      incoming.frames.emplace_back(static_cast<const char*>(zmq_msg_data(&part)), zmq_msg_size(&part));
    }
    incoming.frame_count += 1;
    if (!more) {
      const char* user = zmq_msg_gets(&part, "User-Id");
      if (user != nullptr) incoming.user = user;
    }
    zmq_msg_close(&part);
  }
  return true;
}

bool send(Socket& socket, const std::vector<std::string_view>& frames) {
  for (std::size_t i = 0; i < frames.size(); ++i) {
    const int flags = ZMQ_DONTWAIT | (i + 1 < frames.size() ? ZMQ_SNDMORE : 0);
    if (zmq_send(socket.raw(), frames[i].data(), frames[i].size(), flags) < 0) return false;
  }
  return true;
}

std::string last_error() { return zmq_strerror(zmq_errno()); }

std::string address(const std::string& host, int port) {
  const std::string plain = host == "localhost" ? "127.0.0.1" : host;
  const bool six = plain.find(':') != std::string::npos;
  return "tcp://" + (six ? "[" + plain + "]" : plain) + ":" + std::to_string(port);
}

bool is_loopback(const std::string& host) {
  if (host == "localhost") return true;
  in_addr four{};
  if (inet_pton(AF_INET, host.c_str(), &four) == 1) return (ntohl(four.s_addr) >> 24) == 127;
  in6_addr six{};
  return inet_pton(AF_INET6, host.c_str(), &six) == 1 && IN6_IS_ADDR_LOOPBACK(&six);
}

std::uint64_t random_u64() {
  std::random_device device;
  return (std::uint64_t{device()} << 32) | device();
}

std::int64_t now_ns() {
  return std::chrono::duration_cast<std::chrono::nanoseconds>(
             std::chrono::steady_clock::now().time_since_epoch())
      .count();
}

void silence_protobuf() {
  static std::once_flag once;
  std::call_once(once, [] { google::protobuf::SetLogHandler(nullptr); });
}

void block_signals() {
  sigset_t all;
  sigfillset(&all);
  pthread_sigmask(SIG_BLOCK, &all, nullptr);
}

}  // namespace pastern::link::wire
