// One question, one answer over a DEALER socket.
#include "runtime/link/caller.h"

#include <algorithm>
#include <array>
#include <cstring>

namespace pastern::link {
namespace {

constexpr int kWatched = ZMQ_EVENT_CONNECTED | ZMQ_EVENT_HANDSHAKE_SUCCEEDED |
                         ZMQ_EVENT_HANDSHAKE_FAILED_AUTH | ZMQ_EVENT_HANDSHAKE_FAILED_PROTOCOL |
                         ZMQ_EVENT_HANDSHAKE_FAILED_NO_DETAIL;

long whole_ms(std::int64_t ns) { return static_cast<long>(std::max<std::int64_t>(ns, 0) / 1'000'000 + 1); }

}  // namespace

wire::Socket Dial::bare(int type, std::string& error) {
  wire::Socket socket(context, type);
  bool set = socket.open() && socket.set(ZMQ_MAXMSGSIZE, wire::kLargestAnswer) &&
             socket.set(ZMQ_RECONNECT_IVL, 50) && socket.set(ZMQ_RECONNECT_IVL_MAX, 500) &&
             socket.set(ZMQ_TCP_KEEPALIVE, 1);
  if (set && host.find(':') != std::string::npos) set = socket.set(ZMQ_IPV6, 1);
  if (set && keys) {
    set = socket.set(ZMQ_CURVE_SERVERKEY, keys->robot_public_z85) &&
          socket.set(ZMQ_CURVE_PUBLICKEY, keys->public_z85) &&
          socket.set(ZMQ_CURVE_SECRETKEY, keys->secret_z85);
  }
  if (set) return socket;
  error = "link: found " + wire::last_error() + ", expected a ZeroMQ library with CURVE";
  return {};
}

wire::Socket Dial::socket(int type, int port, std::string& error) {
  wire::Socket socket = bare(type, error);
  if (!socket.open()) return socket;
  const std::string address = wire::address(host, port);
  if (zmq_connect(socket.raw(), address.c_str()) == 0) return socket;
  error = "link: " + address + ": found " + wire::last_error() + ", expected the robot's address";
  return {};
}

bool Caller::open(bool watched) {
  if (socket_.open()) return true;
  socket_ = dial_.bare(ZMQ_DEALER, trouble_);
  if (!socket_.open()) return false;
  const std::string name = "inproc://events-" + std::to_string(wire::random_u64());
  if (watched && zmq_socket_monitor(socket_.raw(), name.c_str(), kWatched) == 0) {
    events_ = wire::Socket(dial_.context, ZMQ_PAIR);
    if (!events_.open() || zmq_connect(events_.raw(), name.c_str()) != 0) stop_watching();
  }
  const std::string address = wire::address(dial_.host, port_);
  if (zmq_connect(socket_.raw(), address.c_str()) == 0) return true;
  trouble_ = "link: " + address + ": found " + wire::last_error() + ", expected the robot's address";
  hang_up();
  return false;
}

// In this order: an event that nobody can take makes ZeroMQ's own thread wait, and with it all sockets.
void Caller::stop_watching() {
  if (socket_.open()) (void)zmq_socket_monitor(socket_.raw(), nullptr, 0);
  events_.close();
}

void Caller::hang_up() {
  stop_watching();
  socket_.close();
}

bool Caller::tell(const std::string& message) { return open(false) && wire::send(socket_, {message}); }

std::optional<std::string> Caller::heard() {
  wire::Incoming incoming;
  while (socket_.open() && wire::receive(socket_, incoming, 2)) {
    if (incoming.frame_count == 1) return std::move(incoming.frames[0]);
  }
  return std::nullopt;
}

void Caller::watch_events() {
  wire::Incoming incoming;
  while (events_.open() && wire::receive(events_, incoming, 2)) {
    if (incoming.frames.empty() || incoming.frames[0].size() < 6) continue;
    std::uint16_t event = 0;  // first two bytes, in the machine's order: zmq_socket_monitor(3)
    std::memcpy(&event, incoming.frames[0].data(), sizeof event);
    connected_ |= event == ZMQ_EVENT_CONNECTED;
    shaken_ |= event == ZMQ_EVENT_HANDSHAKE_SUCCEEDED;
    key_refused_ |= event == ZMQ_EVENT_HANDSHAKE_FAILED_AUTH;
    shake_failed_ |=
        event == ZMQ_EVENT_HANDSHAKE_FAILED_PROTOCOL || event == ZMQ_EVENT_HANDSHAKE_FAILED_NO_DETAIL;
  }
}

bool Caller::wait_for_answer(std::int64_t until_ns, bool stubborn,
                             const std::function<bool(const std::string&)>& is_answer) {
  while (true) {
    while (const std::optional<std::string> came = heard()) {
      if (is_answer(*came)) return true;
    }
    watch_events();
    const std::int64_t left = until_ns - wire::now_ns();
    if (left <= 0 || (key_refused_ && !stubborn)) return false;
    std::array<zmq_pollitem_t, 2> items{
        {{socket_.raw(), 0, ZMQ_POLLIN, 0}, {events_.raw(), 0, ZMQ_POLLIN, 0}}};
    (void)zmq_poll(items.data(), events_.open() ? 2 : 1, whole_ms(left));
  }
}

bool Caller::exchange(const std::string& question, int timeout_ms, int again_ms, bool stubborn,
                      const std::function<bool(const std::string&)>& is_answer) {
  trouble_.clear();
  connected_ = shaken_ = key_refused_ = shake_failed_ = false;
  const std::int64_t end = wire::now_ns() + std::int64_t{timeout_ms} * 1'000'000;
  while (true) {
    if (!open(true)) return false;
    // A connection that cannot take it is as good as one that does not answer.
    (void)wire::send(socket_, {question});
    const std::int64_t again = wire::now_ns() + std::int64_t{std::max(again_ms, 1)} * 1'000'000;
    if (wait_for_answer(std::min(again, end), stubborn, is_answer)) {
      // The connection stands; events that nobody reads would only pile up.
      stop_watching();
      return true;
    }
    // What comes late belongs to the old connection and is never taken for a later answer.
    hang_up();
    if (wire::now_ns() >= end || (key_refused_ && !stubborn)) break;
  }
  say_why(timeout_ms);
  return false;
}

void Caller::say_why(int timeout_ms) {
  const std::string where = wire::address(dial_.host, port_);
  const std::string within = " within " + std::to_string(timeout_ms) + " ms";
  if (key_refused_) {
    trouble_ = "link: " + where + ": the robot refused key '" + (dial_.keys ? dial_.keys->name : "") +
               "', expected one on its list";
  } else if (shaken_) {
    trouble_ = "link: " + where + ": connected, but no answer" + within;
  } else if (connected_ && dial_.keys) {
    trouble_ = "link: " + where + ": found no handshake" + within + ", expected a robot with the key in " +
               dial_.key_folder + "/robot.public";
  } else if (connected_) {
    trouble_ = "link: " + where + ": found no handshake without keys" + within +
               ", expected a key folder if this robot has keys";
  } else {
    trouble_ =
        "link: " + where + ": found nobody" + within + ", expected the onboard program to listen there";
  }
}

}  // namespace pastern::link
