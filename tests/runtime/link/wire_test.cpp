// The wire against its standards: ZMTP 3 greeting and CURVE as a raw TCP socket sees them, Z85 known answers,
// raw garbage at every port. Sources: ZeroMQ RFC 23 and 37 (ZMTP), RFC 25 and 26 (CURVE), RFC 32 (Z85).
#include "runtime/link/wire.h"

#include <arpa/inet.h>
#include <gtest/gtest.h>
#include <poll.h>
#include <sys/resource.h>
#include <sys/socket.h>
#include <unistd.h>

#include <array>
#include <mutex>
#include <random>
#include <thread>

#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

using testing::command_named;
using testing::Site;

class Tcp {
 public:
  explicit Tcp(int port) : fd_(::socket(AF_INET, SOCK_STREAM | SOCK_CLOEXEC, 0)) {
    sockaddr_in to{};
    to.sin_family = AF_INET;
    to.sin_port = htons(static_cast<std::uint16_t>(port));
    to.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    open_ = fd_ >= 0 && ::connect(fd_, reinterpret_cast<const sockaddr*>(&to), sizeof to) == 0;
  }
  ~Tcp() {
    if (fd_ >= 0) ::close(fd_);
  }
  Tcp(const Tcp&) = delete;
  Tcp& operator=(const Tcp&) = delete;
  [[nodiscard]] bool open() const { return open_; }
  [[nodiscard]] int fd() const { return fd_; }
  void send(const std::string& bytes) const {
    [[maybe_unused]] const ssize_t sent =
        ::send(fd_, bytes.data(), bytes.size(), MSG_NOSIGNAL | MSG_DONTWAIT);
  }
  /// At most `size` bytes; fewer when the other side closes or nothing comes for two seconds.
  [[nodiscard]] std::string receive(std::size_t size, int wait_ms = 2000) const {
    std::string all;
    while (all.size() < size) {
      pollfd item{fd_, POLLIN, 0};
      if (::poll(&item, 1, wait_ms) <= 0) break;
      std::array<char, 512> part{};
      const ssize_t got = ::recv(fd_, part.data(), std::min(part.size(), size - all.size()), 0);
      if (got <= 0) break;
      all.append(part.data(), static_cast<std::size_t>(got));
    }
    return all;
  }

 private:
  int fd_;
  bool open_{false};
};

std::string greeting(const std::string& mechanism, bool server = false) {
  std::string bytes("\xff\0\0\0\0\0\0\0\0\x7f\x03\0", 12);
  bytes += mechanism;
  bytes.resize(32);
  bytes.resize(64);
  bytes[32] = server ? 1 : 0;
  return bytes;
}

std::string field(const std::string& name, const std::string& value) {
  std::string bytes(1, static_cast<char>(name.size()));
  bytes += name;
  bytes += std::string(3, '\0') + static_cast<char>(value.size());
  return bytes + value;
}

std::string frame(char flags, const std::string& body) {
  return std::string(1, flags) + static_cast<char>(body.size()) + body;
}

void expect_greeting(const std::string& bytes, const std::string& mechanism) {
  ASSERT_EQ(bytes.size(), 64U);
  EXPECT_EQ(bytes[0], '\xff');
  EXPECT_EQ(bytes[9], '\x7f');
  EXPECT_EQ(bytes[10], '\x03') << "ZMTP 3";
  EXPECT_EQ(bytes.substr(12, 20), mechanism + std::string(20 - mechanism.size(), '\0'));
  EXPECT_EQ(bytes.substr(33), std::string(31, '\0'));
}

TEST(Wire, greeting_names_curve_with_keys_and_null_without) {
  Site guarded(true);
  guarded.start();
  Site open(false);
  open.start();
  for (const int port : {guarded.ports.command, guarded.ports.telemetry, guarded.ports.fetch}) {
    const Tcp tcp(port);
    tcp.send(greeting("CURVE"));
    expect_greeting(tcp.receive(64), "CURVE");
  }
  for (const int port : {open.ports.command, open.ports.telemetry, open.ports.fetch}) {
    const Tcp tcp(port);
    tcp.send(greeting("NULL"));
    expect_greeting(tcp.receive(64), "NULL");
  }
}

TEST(Wire, a_hand_made_req_client_is_answered_frame_by_frame) {
  Site site(false);
  site.start();
  const Tcp tcp(site.ports.command);
  tcp.send(greeting("NULL"));
  expect_greeting(tcp.receive(64), "NULL");
  tcp.send(frame(4, std::string("\x05READY") + field("Socket-Type", "REQ")));
  const std::string head = tcp.receive(2);
  ASSERT_EQ(head.size(), 2U);
  EXPECT_EQ(head[0], '\x04') << "a short command frame";
  const std::string ready = tcp.receive(static_cast<unsigned char>(head[1]));
  EXPECT_EQ(ready.substr(0, 6 + 12 + 4 + 6), std::string("\x05READY") + field("Socket-Type", "ROUTER"));

  v1::Command stop = command_named("stop");
  stop.set_format(1);
  stop.set_id("hand-made");
  tcp.send(frame(1, "") + frame(0, stop.SerializeAsString()));
  const std::string begin = tcp.receive(4);
  ASSERT_EQ(begin.size(), 4U);
  EXPECT_EQ(begin.substr(0, 3), std::string("\x01\0\0", 3)) << "the empty delimiter, then the last frame";
  v1::Answer answer;
  ASSERT_TRUE(answer.ParseFromString(tcp.receive(static_cast<unsigned char>(begin[3]))));
  EXPECT_EQ(answer.id(), "hand-made");
  EXPECT_TRUE(answer.confirmed());
}

TEST(Wire, a_hello_that_is_not_meant_for_this_robot_is_not_welcomed) {
  Site site(true);
  site.start();
  // RFC 26: its box must open with the robot's secret key.
  const Tcp tcp(site.ports.command);
  tcp.send(greeting("CURVE"));
  expect_greeting(tcp.receive(64), "CURVE");
  std::string hello("\x05HELLO\x01\0", 8);
  hello.resize(200, 'x');
  tcp.send(frame(4, hello));
  EXPECT_EQ(tcp.receive(170).find("WELCOME"), std::string::npos);
}

/// Stands between a client and the robot and keeps what passes.
class Tap {
 public:
  explicit Tap(int to_port) : listener_(::socket(AF_INET, SOCK_STREAM | SOCK_CLOEXEC, 0)) {
    sockaddr_in at{};
    at.sin_family = AF_INET;
    at.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    socklen_t size = sizeof at;
    EXPECT_EQ(::bind(listener_, reinterpret_cast<const sockaddr*>(&at), size), 0);
    EXPECT_EQ(::listen(listener_, 1), 0);
    EXPECT_EQ(::getsockname(listener_, reinterpret_cast<sockaddr*>(&at), &size), 0);
    port_ = ntohs(at.sin_port);
    thread_ = std::thread([this, to_port] { run(to_port); });
  }
  ~Tap() {
    ending_ = true;
    thread_.join();
    ::close(listener_);
  }
  Tap(const Tap&) = delete;
  Tap& operator=(const Tap&) = delete;
  [[nodiscard]] int port() const { return port_; }
  [[nodiscard]] std::string from_client() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return from_client_;
  }
  [[nodiscard]] std::string from_robot() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return from_robot_;
  }

 private:
  void run(int to_port) {
    pollfd waiting{listener_, POLLIN, 0};
    if (::poll(&waiting, 1, 10'000) <= 0) return;
    const int client = ::accept(listener_, nullptr, nullptr);
    const Tcp robot(to_port);
    bool both = true;
    while (both && !ending_) {
      both = pass(client, robot.fd(), from_client_) && pass(robot.fd(), client, from_robot_);
    }
    ::close(client);
  }
  bool pass(int from, int to, std::string& kept) {
    pollfd item{from, POLLIN, 0};
    if (::poll(&item, 1, 1) <= 0) return true;
    std::array<char, 4096> part{};
    const ssize_t got = ::recv(from, part.data(), part.size(), 0);
    if (got <= 0) return false;
    const std::lock_guard<std::mutex> lock(mutex_);
    kept.append(part.data(), static_cast<std::size_t>(got));
    return ::send(to, part.data(), static_cast<std::size_t>(got), MSG_NOSIGNAL) == got;
  }
  int listener_;
  int port_{0};
  std::atomic<bool> ending_{false};
  mutable std::mutex mutex_;
  std::string from_client_;
  std::string from_robot_;
  std::thread thread_;
};

struct Frame {
  int flags;
  std::string body;
};

/// RFC 23: flags, then one octet of length, or eight when bit 1 is set.
std::vector<Frame> frames_after_greeting(const std::string& bytes) {
  std::vector<Frame> frames;
  std::size_t at = 64;
  while (at + 2 <= bytes.size()) {
    const int flags = static_cast<unsigned char>(bytes[at]);
    const std::size_t width = (flags & 2) != 0 ? 8 : 1;
    std::size_t length = 0;
    for (std::size_t i = 0; i < width; ++i)
      length = length << 8 | static_cast<unsigned char>(bytes.at(at + 1 + i));
    at += 1 + width;
    frames.push_back(Frame{flags, bytes.substr(at, length)});
    at += length;
  }
  return frames;
}

// RFC 26: HELLO is 200 octets, WELCOME 168, a MESSAGE 33 more than what it carries.
TEST(Wire, with_keys_the_handshake_and_every_message_are_curves_and_nothing_can_be_read) {
  Site site(true);
  const std::string keys = site.ground("anna", true, true);
  site.start();
  const Tap tap(site.ports.command);
  ClientConfig config = site.config_of(keys);
  config.command_port = tap.port();
  std::string error;
  const auto client = Client::connect(config, error);
  ASSERT_NE(client, nullptr) << error;
  v1::Command stop = command_named("stop");
  stop.set_format(1);
  stop.set_id("id-in-the-clear");
  stop.set_operator_name("operator");
  const auto answer = client->ask(stop, 10'000);
  ASSERT_TRUE(answer) << client->trouble();
  EXPECT_TRUE(answer->confirmed());

  const std::string sent = tap.from_client();
  const std::string came = tap.from_robot();
  expect_greeting(sent.substr(0, 64), "CURVE");
  expect_greeting(came.substr(0, 64), "CURVE");
  const std::vector<Frame> ours = frames_after_greeting(sent);
  const std::vector<Frame> theirs = frames_after_greeting(came);
  ASSERT_EQ(ours.size(), 3U);
  ASSERT_EQ(theirs.size(), 3U);
  EXPECT_EQ(ours[0].flags, 4);
  EXPECT_EQ(ours[0].body.size(), 200U);
  EXPECT_EQ(ours[0].body.substr(0, 8), std::string("\x05HELLO\x01\0", 8));
  EXPECT_EQ(theirs[0].body.size(), 168U);
  EXPECT_EQ(theirs[0].body.substr(0, 8), "\x07WELCOME");
  EXPECT_EQ(ours[1].flags, 6) << "a long command frame";
  EXPECT_EQ(ours[1].body.substr(0, 9), "\x08INITIATE");
  EXPECT_EQ(theirs[1].body.substr(0, 6), "\x05READY");
  EXPECT_EQ(ours[2].body.substr(0, 8), "\x07MESSAGE");
  EXPECT_EQ(ours[2].body.size(), 33 + stop.ByteSizeLong());
  EXPECT_EQ(theirs[2].body.size(), 33 + answer->ByteSizeLong());
  for (const std::string& secret :
       {std::string("id-in-the-clear"), std::string("operator"), answer->words()}) {
    EXPECT_EQ(sent.find(secret), std::string::npos) << secret;
    EXPECT_EQ(came.find(secret), std::string::npos) << secret;
  }
}

TEST(Wire, null_and_plain_are_turned_away_where_keys_are_wanted) {
  Site site(true);
  site.start();
  for (const std::string mechanism : {"NULL", "PLAIN", "", "CURVEX"}) {
    const Tcp tcp(site.ports.command);
    tcp.send(greeting(mechanism) + frame(4, std::string("\x05READY") + field("Socket-Type", "REQ")));
    const std::string came = tcp.receive(200);
    EXPECT_LE(came.size(), 64U) << mechanism << ": a greeting and no more";
  }
}

TEST(Wire, raw_garbage_at_every_port_leaves_the_robot_working) {
  Site site(true);
  const std::string keys = site.ground("anna", true, true);
  site.start();
  std::mt19937_64 random(7);
  for (int i = 0; i < 300; ++i) {
    const int port = i % 3 == 0 ? site.ports.command : i % 3 == 1 ? site.ports.telemetry : site.ports.fetch;
    const Tcp tcp(port);
    std::string bytes = i % 2 == 0 ? greeting("CURVE") : std::string();
    bytes.resize(bytes.size() + random() % 400);
    for (std::size_t at = i % 2 == 0 ? 64 : 0; at < bytes.size(); ++at)
      bytes[at] = static_cast<char>(random());
    if (i % 5 == 0) bytes.resize(std::min<std::size_t>(bytes.size(), random() % 70));
    tcp.send(bytes);
    if (i % 10 == 0) (void)tcp.receive(64, 20);
  }
  const auto client = site.client(keys);
  const auto stop = client->ask(command_named("stop"));
  ASSERT_TRUE(stop) << client->trouble();
  EXPECT_TRUE(stop->confirmed());
  EXPECT_EQ(site.line.submitted, 0);
}

// RFC 32's own example, and values computed from its definition; the pair is the one printed in public
// descriptions of CURVE and guards nothing.
TEST(Wire, z85_known_answers) {
  const std::array<std::uint8_t, 8> hello{0x86, 0x4f, 0xd2, 0x6f, 0xb5, 0x59, 0xf7, 0x5b};
  std::array<char, 41> text{};
  ASSERT_NE(zmq_z85_encode(text.data(), hello.data(), hello.size()), nullptr);
  EXPECT_STREQ(text.data(), "HelloWorld");
  const std::array<std::uint8_t, 4> zeros{};
  ASSERT_NE(zmq_z85_encode(text.data(), zeros.data(), 4), nullptr);
  EXPECT_STREQ(text.data(), "00000");
  const std::array<std::uint8_t, 4> ones{0xff, 0xff, 0xff, 0xff};
  ASSERT_NE(zmq_z85_encode(text.data(), ones.data(), 4), nullptr);
  EXPECT_STREQ(text.data(), "%nSc0");
  EXPECT_EQ(zmq_z85_encode(text.data(), hello.data(), 7), nullptr) << "a multiple of 4";
  ASSERT_EQ(zmq_curve_public(text.data(), "D:)Q[IlAW!ahhC2ac:9*A}h:p?([4%wOTJ%JR%cs"), 0);
  EXPECT_STREQ(text.data(), "Yne@$w-vo<fVvi]a<NY6T1ed:M$fCG*[IaLV{hID");
}

TEST(Wire, loopback_is_told_from_everything_else) {
  for (const std::string host : {"127.0.0.1", "127.255.255.254", "localhost", "::1"}) {
    EXPECT_TRUE(wire::is_loopback(host)) << host;
  }
  for (const std::string host : {"", "*", "lo", "0.0.0.0", "::", "128.0.0.1", "127.0.0.1 ", "127.1",
                                 "0127.0.0.1", "localhost.example", "::ffff:127.0.0.1", "2130706433"}) {
    EXPECT_FALSE(wire::is_loopback(host)) << host;
  }
  EXPECT_EQ(wire::address("::1", 7741), "tcp://[::1]:7741");
  EXPECT_EQ(wire::address("localhost", 1), "tcp://127.0.0.1:1");
}

// Whoever can reach the port can open connections. With no file descriptor left for more, those that are up
// go on.
TEST(Wire, running_out_of_connections_does_not_end_the_robot) {
  Site site(false);
  site.start();
  const auto client = site.client();
  ASSERT_TRUE(client->ask(command_named("ask_status")));
  rlimit before{};
  ASSERT_EQ(::getrlimit(RLIMIT_NOFILE, &before), 0);
  const rlimit few{200, before.rlim_max};
  ASSERT_EQ(::setrlimit(RLIMIT_NOFILE, &few), 0);
  {
    std::vector<std::unique_ptr<Tcp>> many;
    for (int i = 0; i < 300; ++i) many.push_back(std::make_unique<Tcp>(site.ports.command));
    const auto stop = client->ask(command_named("stop"), 300);
    EXPECT_TRUE(stop && stop->confirmed());
  }
  ASSERT_EQ(::setrlimit(RLIMIT_NOFILE, &before), 0);
  const auto again = site.client()->ask(command_named("stop"), 10'000);
  EXPECT_TRUE(again && again->confirmed());
}

}  // namespace
}  // namespace pastern::link
