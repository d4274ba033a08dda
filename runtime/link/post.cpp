// The robot's sockets.
#include "runtime/link/post.h"

#include <array>
#include <cstring>

namespace pastern::link {
namespace {

constexpr char kZapEndpoint[] = "inproc://zeromq.zap.01";  // RFC 27
constexpr int kMostZapPerTurn = 32;
constexpr int kHandshakeMs = 1000;
constexpr int kBacklog = 32;
// ZMQ_ZAP_ENFORCE_DOMAIN: in libzmq since 4.3, but its header shows the name to draft builds only.
constexpr int kEnforceDomain = 93;

// Set and read back: a library that does not know it would leave the door open in silence.
bool enforce_domain(wire::Socket& socket) {
  int value = 0;
  std::size_t size = sizeof value;
  return socket.set(ZMQ_ZAP_DOMAIN, std::string(wire::kDomain)) && socket.set(kEnforceDomain, 1) &&
         zmq_getsockopt(socket.raw(), kEnforceDomain, &value, &size) == 0 && value == 1;
}

}  // namespace

std::unique_ptr<Post> Post::bind(const ServerConfig& config, const RobotKeys* keys, std::string& error) {
  std::unique_ptr<Post> post(new Post);
  post->host_ = config.host;
  post->ports_ = Ports{config.command_port, config.telemetry_port, config.fetch_port};
  if (keys != nullptr) post->secret_ = keys->secret_z85;
  // Before any other socket is bound: from the first connection on there is somebody who judges keys.
  post->zap_ = wire::Socket(post->context_, ZMQ_REP);
  if (!post->zap_.open() || zmq_bind(post->zap_.raw(), kZapEndpoint) != 0) {
    error = std::string("link: ") + kZapEndpoint + ": found " + wire::last_error() + ", expected to bind it";
    return nullptr;
  }
  if (!post->bound(post->command_, ZMQ_ROUTER, wire::kLargestCommand, post->ports_.command, error) ||
      !post->bound(post->telemetry_, ZMQ_PUB, wire::kLargestFetch, post->ports_.telemetry, error) ||
      !post->bound(post->fetch_, ZMQ_ROUTER, wire::kLargestFetch, post->ports_.fetch, error)) {
    return nullptr;
  }
  return post;
}

// Closed again when any option is refused: CURVE must never be missing in silence.
wire::Socket Post::made(int type, std::int64_t largest) {
  wire::Socket socket(context_, type);
  bool set = socket.open() && socket.set(ZMQ_MAXMSGSIZE, largest) && socket.set(ZMQ_BACKLOG, kBacklog) &&
             socket.set(ZMQ_HANDSHAKE_IVL, kHandshakeMs) && socket.set(ZMQ_TCP_KEEPALIVE, 1) &&
             socket.set(ZMQ_TCP_KEEPALIVE_IDLE, 5) && socket.set(ZMQ_TCP_KEEPALIVE_INTVL, 2) &&
             socket.set(ZMQ_TCP_KEEPALIVE_CNT, 3) && socket.set(ZMQ_RCVHWM, 64) &&
             socket.set(ZMQ_SNDHWM, 1000);
  if (set && host_.find(':') != std::string::npos) set = socket.set(ZMQ_IPV6, 1);
  if (set && !secret_.empty()) {
    // Without it libzmq lets every key in whenever nobody answers for ZAP.
    set =
        socket.set(ZMQ_CURVE_SERVER, 1) && socket.set(ZMQ_CURVE_SECRETKEY, secret_) && enforce_domain(socket);
  }
  if (!set) socket.close();
  return socket;
}

bool Post::bound(wire::Socket& socket, int type, std::int64_t largest, int& port, std::string& error) {
  const std::string where = port == 0 ? "tcp://" + host_ + ":*" : wire::address(host_, port);
  socket = made(type, largest);
  if (!socket.open()) {
    error = "link: " + where + ": found " + wire::last_error() + ", expected a ZeroMQ library with CURVE";
    return false;
  }
  const std::string address = port == 0 ? wire::address(host_, 0) : where;
  if (zmq_bind(socket.raw(), address.c_str()) != 0) {
    error =
        "link: " + where + ": found " + wire::last_error() + ", expected a free port at an address of ours";
    return false;
  }
  const std::string endpoint = socket.endpoint();
  port = std::atoi(endpoint.c_str() + endpoint.rfind(':') + 1);
  return true;
}

void Post::wait(int extra_fd, long timeout_ms) {
  std::array<zmq_pollitem_t, 5> items{{{zap_.raw(), 0, ZMQ_POLLIN, 0},
                                       {command_.raw(), 0, ZMQ_POLLIN, 0},
                                       {fetch_.raw(), 0, ZMQ_POLLIN, 0},
                                       {nullptr, extra_fd, ZMQ_POLLIN, 0},
                                       {telemetry_.raw(), 0, ZMQ_POLLIN, 0}}};
  // Telemetry has nothing to read; polling lets it take in new connections.
  (void)zmq_poll(items.data(), telemetry_.open() ? 5 : 4, timeout_ms);
}

void Post::admit(const Allowed& allowed) {
  wire::Incoming request;
  for (int i = 0; i < kMostZapPerTurn && wire::receive(zap_, request, 7); ++i) {
    // version, request id, domain, address, identity, mechanism, credentials
    const bool whole = request.frame_count == 7 && request.frames[0] == "1.0";
    std::array<char, 41> key{};
    bool good = whole && request.frames[2] == wire::kDomain && request.frames[5] == "CURVE" &&
                request.frames[6].size() == 32 &&
                zmq_z85_encode(key.data(), reinterpret_cast<const std::uint8_t*>(request.frames[6].data()),
                               32) != nullptr;
    good = good && allowed.contains(key.data());
    const std::string id = request.frame_count > 1 ? request.frames[1] : std::string();
    wire::send(zap_, {"1.0", id, good ? "200" : "400", good ? "on the list" : "not on the list",
                      good ? std::string_view(key.data(), 40) : std::string_view(), std::string_view()});
  }
}

Sender Post::sender(const std::string& user, const Allowed& allowed) const {
  // Without keys the sockets are on loopback only, and whoever can connect commands.
  if (secret_.empty()) return Sender{"", "", Role::commander};
  const auto found = allowed.find(user);
  if (found == allowed.end()) return Sender{user, "", std::nullopt};
  return Sender{user, found->second.name, found->second.commander ? Role::commander : Role::observer};
}

Mail Post::mail(wire::Incoming& incoming, const Allowed& allowed) const {
  Mail mail;
  mail.route.id = std::move(incoming.frames[0]);
  mail.sender = sender(incoming.user, allowed);
  mail.route.delimited = incoming.frame_count > 2 && incoming.frames[1].empty();
  const std::size_t body = mail.route.delimited ? 2 : 1;
  mail.framed = incoming.frame_count == body + 1;
  if (mail.framed) mail.bytes = std::move(incoming.frames[body]);
  return mail;
}

std::vector<Mail> Post::commands(const Allowed& allowed, std::size_t most, std::size_t most_bytes) {
  std::vector<Mail> mails;
  std::size_t bytes = 0;
  wire::Incoming incoming;
  while (mails.size() < most && bytes < most_bytes && wire::receive(command_, incoming, 3)) {
    mails.push_back(mail(incoming, allowed));
    bytes += mails.back().bytes.size();
  }
  return mails;
}

std::optional<Mail> Post::fetch(const Allowed& allowed) {
  wire::Incoming incoming;
  if (!wire::receive(fetch_, incoming, 3)) return std::nullopt;
  return mail(incoming, allowed);
}

// A ROUTER drops what it cannot deliver: nobody can make it wait.
void Post::send_to(wire::Socket& socket, const Route& route, const std::string& bytes) {
  if (route.delimited) {
    wire::send(socket, {route.id, std::string_view(), bytes});
  } else {
    wire::send(socket, {route.id, bytes});
  }
}

void Post::publish(const std::string& bytes) {
  if (telemetry_.open()) wire::send(telemetry_, {wire::kTopic, bytes});
}

void Post::drop_listeners() { telemetry_.close(); }

void Post::publish_again() {
  std::string error;
  int port = ports_.telemetry;
  wire::Socket again;
  if (bound(again, ZMQ_PUB, wire::kLargestFetch, port, error)) telemetry_ = std::move(again);
}

}  // namespace pastern::link
