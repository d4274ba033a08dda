// The ground's end of the link.
#include "runtime/link/client.h"

#include <algorithm>
#include <deque>

#include "runtime/link/caller.h"
#include "runtime/link/keys.h"
#include "runtime/link/renewal.h"

namespace pastern::link {
namespace {

constexpr std::uint32_t kFormat = 1;
constexpr int kStopAgainMs = 250;
constexpr int kGapTries = 3;
constexpr int kGapPieces = 1000;

}  // namespace

struct Client::Impl {
  explicit Impl(const ClientConfig& config_in)
      : config(config_in), commands(dial, config_in.command_port), fetches(dial, config_in.fetch_port) {}

  void listen_to_more(int timeout_ms);
  [[nodiscard]] bool fill_gap(std::uint64_t from, std::uint64_t to, int timeout_ms);
  void give_head();

  ClientConfig config;
  Dial dial;
  Caller commands;
  Caller fetches;
  wire::Socket telemetry;
  std::string trouble;
  std::optional<std::uint64_t> expected;  ///< sequence number that next() gives next
  std::deque<v1::Telemetry> arrived;      ///< as published, gaps and all
  std::deque<v1::Telemetry> ready;        ///< in order
  int gap_failures{0};
  std::unique_ptr<Renewal> renewal;
};

Client::Client() = default;
Client::~Client() = default;

std::unique_ptr<Client> Client::connect(const ClientConfig& config, std::string& error) {
  for (const int port : {config.command_port, config.telemetry_port, config.fetch_port}) {
    if (port >= 1 && port <= 65535) continue;
    error = "link: found port " + std::to_string(port) + ", expected 1 to 65535";
    return nullptr;
  }
  wire::silence_protobuf();
  std::unique_ptr<Client> client(new Client);
  client->impl_ = std::make_unique<Impl>(config);
  Impl& impl = *client->impl_;
  impl.dial.host = config.host;
  impl.dial.key_folder = config.key_folder;
  if (!config.key_folder.empty()) {
    GroundKeys keys;
    if (!read_ground_keys(config.key_folder, keys, error)) return nullptr;
    impl.dial.keys = keys;
  }
  impl.telemetry = impl.dial.socket(ZMQ_SUB, config.telemetry_port, error);
  if (!impl.telemetry.open()) return nullptr;
  if (impl.telemetry.set(ZMQ_SUBSCRIBE, std::string(wire::kTopic))) return client;
  error = "link: found " + wire::last_error() + ", expected to listen to telemetry";
  return nullptr;
}

std::optional<v1::Answer> Client::ask(v1::Command command, int timeout_ms) {
  command.set_format(kFormat);
  if (command.id().empty()) command.set_id(fresh_id());
  if (command.operator_name().empty()) command.set_operator_name(impl_->config.operator_name);
  if (command.baton() == 0) command.set_baton(baton());
  const bool stops = command.has_stop() || command.has_halt();
  const int again_ms = stops ? std::min(timeout_ms / 3, kStopAgainMs) : timeout_ms / 3;
  v1::Answer answer;
  // A refusal without an id is of a message that the robot could not read: ours, as only one is under way.
  const auto is_answer = [&](const std::string& bytes) {
    return answer.ParseFromString(bytes) &&
           (answer.id() == command.id() || (answer.id().empty() && !answer.accepted()));
  };
  impl_->trouble.clear();
  if (!impl_->commands.exchange(command.SerializeAsString(), timeout_ms, again_ms, stops, is_answer)) {
    impl_->trouble = impl_->commands.trouble();
    return std::nullopt;
  }
  if (answer.has_status() && !impl_->expected) impl_->expected = answer.status().last_sequence() + 1;
  return answer;
}

std::optional<v1::Fetched> Client::fetch(const v1::Fetch& fetch, int timeout_ms) {
  v1::Fetched fetched;
  const auto is_answer = [&](const std::string& bytes) { return fetched.ParseFromString(bytes); };
  impl_->trouble.clear();
  if (impl_->fetches.exchange(fetch.SerializeAsString(), timeout_ms, timeout_ms / 3, false, is_answer)) {
    return fetched;
  }
  impl_->trouble = impl_->fetches.trouble();
  return std::nullopt;
}

void Client::listen_from(std::uint64_t sequence) { impl_->expected = sequence; }

std::optional<v1::Telemetry> Client::next(int timeout_ms) {
  const std::int64_t end = wire::now_ns() + std::int64_t{timeout_ms} * 1'000'000;
  const auto left_ms = [end] {
    return static_cast<int>(std::max<std::int64_t>(end - wire::now_ns(), 0) / 1'000'000);
  };
  while (true) {
    if (!impl_->ready.empty()) {
      v1::Telemetry first = std::move(impl_->ready.front());
      impl_->ready.pop_front();
      impl_->expected = first.sequence() + 1;
      return first;
    }
    if (impl_->arrived.empty()) impl_->listen_to_more(left_ms());
    if (impl_->arrived.empty()) return std::nullopt;
    const std::uint64_t head = impl_->arrived.front().sequence();
    const bool gap = impl_->expected && head > *impl_->expected;
    const bool filled = !gap || impl_->fill_gap(*impl_->expected, head - 1, std::max(left_ms(), 100));
    if (filled || ++impl_->gap_failures >= kGapTries) {
      impl_->give_head();
    } else if (left_ms() == 0) {
      return std::nullopt;
    }
  }
}

void Client::Impl::give_head() {
  gap_failures = 0;
  ready.push_back(std::move(arrived.front()));
  arrived.pop_front();
}

void Client::Impl::listen_to_more(int timeout_ms) {
  zmq_pollitem_t item{telemetry.raw(), 0, ZMQ_POLLIN, 0};
  wire::Incoming incoming;
  bool came = wire::receive(telemetry, incoming, 2);
  if (!came && zmq_poll(&item, 1, timeout_ms) > 0) came = wire::receive(telemetry, incoming, 2);
  v1::Telemetry message;
  if (came && incoming.frame_count == 2 && message.ParseFromString(incoming.frames[1]))
    arrived.push_back(message);
}

// The robot sends a long stretch in pieces, and only what it keeps: an empty piece is the end.
bool Client::Impl::fill_gap(std::uint64_t from, std::uint64_t to, int timeout_ms) {
  for (int piece = 0; piece < kGapPieces && from <= to; ++piece) {
    v1::Fetch wanted;
    wanted.mutable_telemetry()->set_from_sequence(from);
    wanted.mutable_telemetry()->set_to_sequence(to);
    v1::Fetched fetched;
    const auto is_answer = [&](const std::string& bytes) { return fetched.ParseFromString(bytes); };
    if (!fetches.exchange(wanted.SerializeAsString(), timeout_ms, timeout_ms / 3 + 1, false, is_answer) ||
        !fetched.ok()) {
      return false;
    }
    const std::uint64_t begin = from;
    for (const v1::Telemetry& one : fetched.telemetry()) {
      if (one.sequence() < from || one.sequence() > to) continue;
      ready.push_back(one);
      from = one.sequence() + 1;
      expected = from;
    }
    if (from == begin) return true;
  }
  return true;
}

bool Client::take_baton(std::string& why) {
  give_baton();
  v1::Command command;
  (void)command.mutable_take_baton();
  const std::optional<v1::Answer> answer = ask(command);
  if (!answer || !answer->accepted()) {
    why = answer ? answer->words() : impl_->trouble;
    return false;
  }
  impl_->renewal = std::make_unique<Renewal>(impl_->dial, impl_->config.command_port,
                                             impl_->config.operator_name, answer->baton());
  return true;
}

void Client::give_baton() {
  const std::uint64_t number = baton();
  impl_->renewal.reset();
  if (number == 0) return;
  v1::Command command;
  command.set_baton(number);
  (void)command.mutable_give_baton();
  // Not reached, it lapses by itself.
  (void)ask(command, 1000);
}

std::uint64_t Client::baton() const { return impl_->renewal ? impl_->renewal->number() : 0; }

const std::string& Client::trouble() const { return impl_->trouble; }

}  // namespace pastern::link
