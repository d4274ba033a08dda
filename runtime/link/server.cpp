// The link thread: one turn looks at keys, commands (stops first), answers and telemetry, fetches, each
// bounded.
#include "runtime/link/server.h"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <exception>
#include <mutex>
#include <optional>
#include <thread>
#include <vector>

#include "runtime/link/allow_list.h"
#include "runtime/link/desk.h"
#include "runtime/link/outbox.h"
#include "runtime/link/post.h"

namespace pastern::link {
namespace {

constexpr std::size_t kCommandsPerTurn = 64;
constexpr std::size_t kCommandBytesPerTurn = 1 << 20;
constexpr std::size_t kOutPerTurn = 128;
constexpr std::size_t kFetchesPerTurn = 16;
constexpr std::size_t kMostFetches = 64;
constexpr std::size_t kMostFetchesEach = 8;
constexpr std::int64_t kForgottenAfterNs = 60'000'000'000;
constexpr long kIdleMs = 1000;
constexpr long kRebindMs = 5;
constexpr std::chrono::microseconds kLookAgain{100};  // while a stop waits for the cycle

/// Who waits for which fetch. Bounded for each asker and in all, so that whoever may only read cannot fill
/// the session thread's queue, which commands share.
class Fetches {
 public:
  /// False when the asker, or all together, have too many under way. An asker is a key; without keys a
  /// connection.
  [[nodiscard]] bool add(Ticket ticket, const Mail& mail, std::int64_t now_ns) {
    std::erase_if(entries_,
                  [now_ns](const Entry& entry) { return now_ns - entry.since_ns > kForgottenAfterNs; });
    const std::string& asker = mail.sender.key.empty() ? mail.route.id : mail.sender.key;
    const auto theirs = std::count_if(entries_.begin(), entries_.end(),
                                      [&asker](const Entry& entry) { return entry.asker == asker; });
    if (entries_.size() >= kMostFetches || static_cast<std::size_t>(theirs) >= kMostFetchesEach) return false;
    entries_.push_back(Entry{ticket.number, now_ns, asker, mail.route});
    return true;
  }

  [[nodiscard]] std::optional<Route> take(Ticket ticket) {
    const auto found = std::find_if(entries_.begin(), entries_.end(),
                                    [ticket](const Entry& entry) { return entry.ticket == ticket.number; });
    if (found == entries_.end()) return std::nullopt;
    const Route route = found->route;
    entries_.erase(found);
    return route;
  }

 private:
  struct Entry {
    std::uint64_t ticket;
    std::int64_t since_ns;
    std::string asker;
    Route route;
  };
  std::vector<Entry> entries_;
};

std::string refused_fetch(const std::string& words) {
  v1::Fetched fetched;
  fetched.set_ok(false);
  fetched.set_words(words);
  return fetched.SerializeAsString();
}

}  // namespace

struct Server::Impl {
  Impl(const ServerConfig& config, Line& line_in, std::unique_ptr<Post> post_in)
      : line(line_in),
        post(std::move(post_in)),
        // 1e12 to 5e15: below 2^53, so that every JSON reader keeps it.
        desk(line_in, config.baton_lapse_ms * 1'000'000, 1'000'000'000'000 + (wire::random_u64() >> 12)) {}

  void run();
  void turn();
  void wait();
  void send_out();
  void serve_fetches(const Allowed& allowed);
  void serve_fetch(const Mail& mail);
  void send_replies();
  void note_holder();
  void heed_withdrawals();

  Line& line;
  std::unique_ptr<Post> post;
  Desk desk;
  Outbox outbox;
  Fetches fetches;
  std::uint64_t withdrawals_seen{0};
  std::atomic<bool> ending{false};
  mutable std::mutex holder_mutex;
  std::string holder;
  std::unique_ptr<AllowList> list;  ///< null without keys
  std::thread thread;
};

void Server::Impl::run() {
  wire::block_signals();
  while (!ending.load()) {
    wait();
    turn();
  }
}

void Server::Impl::wait() {
  if (desk.stop_pending()) {
    post->wait(outbox.fd(), 0);
    std::this_thread::sleep_for(kLookAgain);
    return;
  }
  const std::int64_t now = wire::now_ns();
  const std::int64_t due_ms = (std::max(desk.wake_ns(), now) - now) / 1'000'000 + 1;
  long timeout_ms = static_cast<long>(std::min<std::int64_t>(due_ms, kIdleMs));
  if (!post->publishing()) timeout_ms = std::min(timeout_ms, kRebindMs);
  post->wait(outbox.fd(), timeout_ms);
}

void Server::Impl::turn() {
  static const Allowed nobody;
  const std::shared_ptr<const Allowed> listed = list ? list->now() : nullptr;
  const Allowed& allowed = listed ? *listed : nobody;
  std::vector<Mail> mails = post->commands(allowed, kCommandsPerTurn, kCommandBytesPerTurn);
  desk.serve(mails, wire::now_ns());
  desk.judge(wire::now_ns());
  send_replies();
  post->admit(allowed);
  send_out();
  serve_fetches(allowed);
  heed_withdrawals();
  note_holder();
}

void Server::Impl::send_replies() {
  for (const Reply& reply : desk.replies()) post->reply(reply.route, reply.answer.SerializeAsString());
  desk.replies().clear();
}

void Server::Impl::send_out() {
  for (const Out& out : outbox.take(kOutPerTurn)) {
    if (const auto* answer = std::get_if<OutAnswer>(&out)) {
      desk.answered(answer->ticket, answer->answer);
    } else if (const auto* telemetry = std::get_if<OutTelemetry>(&out)) {
      post->publish(telemetry->bytes);
    } else if (const auto* fetched = std::get_if<OutFetched>(&out)) {
      if (const std::optional<Route> route = fetches.take(fetched->ticket)) {
        post->reply_fetch(*route, fetched->bytes);
      }
    }
  }
  send_replies();
}

void Server::Impl::serve_fetches(const Allowed& allowed) {
  for (std::size_t i = 0; i < kFetchesPerTurn; ++i) {
    const std::optional<Mail> mail = post->fetch(allowed);
    if (!mail) return;
    serve_fetch(*mail);
  }
}

void Server::Impl::serve_fetch(const Mail& mail) {
  const auto refuse = [&](const std::string& words) {
    post->reply_fetch(mail.route, refused_fetch("refused: " + words));
  };
  if (!mail.sender.role) return refuse("this key is not on the robot's list");
  v1::Fetch fetch;
  if (!mail.framed) return refuse("found a message of several frames, expected one Fetch");
  if (!fetch.ParseFromString(mail.bytes) || fetch.what_case() == v1::Fetch::WHAT_NOT_SET) {
    return refuse("found " + std::to_string(mail.bytes.size()) +
                  " bytes that are no Fetch of pastern/v1/link.proto");
  }
  const Ticket ticket = desk.next_ticket();
  if (!fetches.add(ticket, mail, wire::now_ns())) return refuse("too many of yours are waiting; try again");
  if (line.submit(ticket, fetch)) return;
  (void)fetches.take(ticket);
  refuse("too many are waiting; try again");
}

// A PUB socket cannot end one connection: it ends all, and who is still on the list comes back by itself.
void Server::Impl::heed_withdrawals() {
  if (list && list->withdrawals() != withdrawals_seen) {
    withdrawals_seen = list->withdrawals();
    post->drop_listeners();
  }
  if (!post->publishing()) post->publish_again();
}

void Server::Impl::note_holder() {
  const std::lock_guard<std::mutex> lock(holder_mutex);
  if (holder != desk.baton().holder()) holder = desk.baton().holder();
}

Server::Server() = default;

namespace {

bool sound(const ServerConfig& config, std::string& error) {
  for (const int port : {config.command_port, config.telemetry_port, config.fetch_port}) {
    if (port >= 0 && port <= 65535) continue;
    error = "link: found port " + std::to_string(port) + ", expected 0 to 65535";
    return false;
  }
  if (config.baton_lapse_ms < 100 || config.baton_lapse_ms > 60'000) {
    error = "link: found baton_lapse_ms " + std::to_string(config.baton_lapse_ms) + ", expected 100 to 60000";
    return false;
  }
  if (config.key_folder.empty() && !wire::is_loopback(config.host)) {
    error = "link: found address '" + config.host +
            "' without keys, expected 127.0.0.1 or ::1, or a key folder: without keys anybody who can "
            "connect commands";
    return false;
  }
  return true;
}

}  // namespace

std::unique_ptr<Server> Server::start(const ServerConfig& config, Line& line, std::string& error) {
  if (!sound(config, error)) return nullptr;
  const bool guarded = !config.key_folder.empty();
  RobotKeys keys;
  if (guarded && !read_robot_keys(config.key_folder, keys, error)) return nullptr;
  std::unique_ptr<Post> post = Post::bind(config, guarded ? &keys : nullptr, error);
  if (!post) return nullptr;
  std::unique_ptr<Server> server(new Server);
  server->impl_ = std::make_unique<Impl>(config, line, std::move(post));
  Impl& impl = *server->impl_;
  if (impl.outbox.fd() < 0) {
    error = "link: found no eventfd, expected the system to give one";
    return nullptr;
  }
  if (guarded) {
    impl.list =
        std::make_unique<AllowList>(config.key_folder, by_key(keys.allowed), [&impl] { impl.outbox.wake(); });
  }
  impl.thread = std::thread([&impl] { impl.run(); });
  return server;
}

Server::~Server() {
  if (!impl_ || !impl_->thread.joinable()) return;
  impl_->ending.store(true);
  impl_->outbox.wake();
  impl_->thread.join();
  impl_->list.reset();
}

void Server::answer(Ticket ticket, const v1::Answer& answer) {
  impl_->outbox.put(OutAnswer{ticket, answer}, answer.ByteSizeLong());
}

void Server::answer(Ticket ticket, const v1::Fetched& fetched) {
  std::string bytes = fetched.SerializeAsString();
  const std::size_t size = bytes.size();
  impl_->outbox.put(OutFetched{ticket, std::move(bytes)}, size);
}

void Server::publish(const v1::Telemetry& telemetry) {
  std::string bytes = telemetry.SerializeAsString();
  const std::size_t size = bytes.size();
  impl_->outbox.put(OutTelemetry{std::move(bytes)}, size);
}

std::string Server::baton_holder() const {
  const std::lock_guard<std::mutex> lock(impl_->holder_mutex);
  return impl_->holder;
}

std::uint64_t Server::dropped() const { return impl_->outbox.dropped(); }

Ports Server::ports() const { return impl_->post->ports(); }

}  // namespace pastern::link
