// Whoever may not move the robot tries to: real pastern-onboard with keys at wall pace, the drives being the
// looped plug-in that notes every command. A key that is not listed, an observer, a stale and a stolen baton,
// a replayed command, garbage, truncated and altered messages, raw bytes at every port. Before and after, the
// rightful operator moves it: a robot that cannot be moved at all would pass every attack.
#include <arpa/inet.h>
#include <fmt/format.h>
#include <sys/socket.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <atomic>
#include <chrono>
#include <filesystem>
#include <functional>
#include <memory>
#include <optional>
#include <random>
#include <string>
#include <thread>
#include <vector>

#include "runtime/link/caller.h"
#include "runtime/link/client.h"
#include "runtime/link/keys.h"
#include "runtime/link/wire.h"
#include "tests/bench/promise.h"
#include "tests/bench/rig/onboard_process.h"
#include "tests/bench/rig/robot_in_loop.h"

namespace pastern::bench {
namespace {

using Random = std::mt19937_64;

void pause_ms(int ms) { std::this_thread::sleep_for(std::chrono::milliseconds(ms)); }

bool until(const std::function<bool()>& is_true) {
  for (int i = 0; i < 2000; ++i) {
    if (is_true()) return true;
    pause_ms(5);
  }
  return false;
}

/// Counts the commands with torque on that reach the drives.
class Watch {
 public:
  explicit Watch(const looped_ring& ring) : ring_(ring), thread_([this] { run(); }) {}
  ~Watch() {
    ending_ = true;
    thread_.join();
  }
  Watch(const Watch&) = delete;
  Watch& operator=(const Watch&) = delete;
  [[nodiscard]] std::uint64_t moved() const { return moved_; }
  [[nodiscard]] std::uint64_t seen() const { return seen_; }
  /// Commands that were overwritten before this thread got to them: could have been anything.
  [[nodiscard]] std::uint64_t missed() const { return missed_; }
  [[nodiscard]] bool torque_on() const {
    const std::uint64_t n = written();
    return n > 0 && ring_.entry[(n - 1) % LOOPED_RING].torque_on != 0;
  }

 private:
  [[nodiscard]] std::uint64_t written() const { return __atomic_load_n(&ring_.written, __ATOMIC_ACQUIRE); }
  void run() {
    std::uint64_t at = written();
    while (!ending_) {
      const std::uint64_t end = written();
      if (end - at > LOOPED_RING) {
        missed_ += end - at - LOOPED_RING;
        at = end - LOOPED_RING;
      }
      for (; at < end; ++at) {
        moved_ += ring_.entry[at % LOOPED_RING].torque_on != 0 ? 1 : 0;
        seen_ += 1;
      }
      pause_ms(20);
    }
  }
  const looped_ring& ring_;
  std::atomic<bool> ending_{false};
  std::atomic<std::uint64_t> moved_{0};
  std::atomic<std::uint64_t> seen_{0};
  std::atomic<std::uint64_t> missed_{0};
  std::thread thread_;
};

/// Sends bytes as they are, and counts the answers: what is answered has been looked at.
class Sender {
 public:
  Sender(const std::string& key_folder, int port, std::uint64_t at_once = 200) : at_once_(at_once) {
    dial_.host = "127.0.0.1";
    dial_.key_folder = key_folder;
    link::GroundKeys keys;
    if (!link::read_ground_keys(key_folder, keys, error_)) return;
    dial_.keys = keys;
    socket_ = dial_.socket(ZMQ_DEALER, port, error_);
  }
  void send(const std::string& bytes) {
    if (!socket_.open()) return;
    for (int i = 0; i < 500 && (sent_ - answered_ >= at_once_ || !link::wire::send(socket_, {bytes})); ++i)
      drain(10);
    sent_ += 1;
    drain(0);
  }
  void finish() {
    for (int i = 0; i < 200 && answered_ < sent_; ++i) drain(10);
  }
  [[nodiscard]] std::uint64_t sent() const { return sent_; }
  [[nodiscard]] std::uint64_t answered() const { return answered_; }

 private:
  void drain(long wait_ms) {
    zmq_pollitem_t item{socket_.raw(), 0, ZMQ_POLLIN, 0};
    if (wait_ms > 0) (void)zmq_poll(&item, 1, wait_ms);
    link::wire::Incoming incoming;
    while (link::wire::receive(socket_, incoming, 1)) answered_ += 1;
  }
  const std::uint64_t at_once_;
  std::string error_;
  link::Dial dial_;
  link::wire::Socket socket_;
  std::uint64_t sent_{0};
  std::uint64_t answered_{0};
};

struct Attack {
  std::string name;
  std::uint64_t messages{0};
  std::uint64_t answered{0};
};

struct Options {
  int messages{100'000};
  std::uint64_t seed{1};
};

class Bench {
 public:
  Bench(const Options& options, std::string folder)
      : options_(options), folder_(std::move(folder)), random_(options.seed) {}

  [[nodiscard]] bool run(std::string& error);

 private:
  [[nodiscard]] bool set_up(std::string& error);
  [[nodiscard]] std::string ground(const std::string& name, bool listed, bool commander,
                                   std::string& error) const;
  [[nodiscard]] link::ClientConfig config(const std::string& keys) const;
  [[nodiscard]] bool accepted(const v1::Command& command, std::string& error);
  [[nodiscard]] bool rightful_walk(std::string& bytes, std::string& error);
  void attack();
  void stranger(int messages);
  void raw_bytes(int connections);
  void observer(int messages);
  void stale_baton(int messages);
  void replay(int messages, const std::string& bytes);
  void damaged(int messages, bool to_fetch);
  [[nodiscard]] v1::Command motion(std::uint64_t baton);
  [[nodiscard]] std::string damage(std::string bytes);
  void report(bool moves_afterwards, const std::string& error);

  const Options options_;
  const std::string folder_;
  Random random_;
  std::string walk_bytes_;
  std::string anna_, ben_, screen_, stranger_;
  std::unique_ptr<OnboardProcess> onboard_;
  std::unique_ptr<Watch> watch_;
  std::unique_ptr<link::Client> client_;
  std::vector<Attack> attacks_;
  std::uint64_t moved_{0};
  bool alive_{false};
};

std::string Bench::ground(const std::string& name, bool listed, bool commander, std::string& error) const {
  const std::string folder = folder_ + "/" + name;
  if (!link::make_pair(folder, name, error)) return {};
  std::filesystem::copy_file(folder_ + "/robot/robot.public", folder + "/robot.public");
  link::GroundKeys keys;
  if (!link::read_ground_keys(folder, keys, error)) return {};
  if (listed && !link::allow(folder_ + "/robot", name, commander, keys.public_z85, error)) return {};
  return folder;
}

link::ClientConfig Bench::config(const std::string& keys) const {
  link::ClientConfig config;
  config.command_port = onboard_->command_port();
  config.telemetry_port = onboard_->telemetry_port();
  config.fetch_port = onboard_->fetch_port();
  config.key_folder = keys;
  return config;
}

bool Bench::set_up(std::string& error) {
  if (!link::make_pair(folder_ + "/robot", "robot", error)) return false;
  anna_ = ground("anna", true, true, error);
  ben_ = ground("ben", true, true, error);
  screen_ = ground("screen", true, false, error);
  stranger_ = ground("stranger", false, false, error);
  if (!error.empty()) return false;
  v1::Robot robot = shipped_robot("dunlin12").robot();
  robot.set_rise_s(0.2);
  robot.mutable_guard()->set_damp_s(0.02);
  robot.mutable_guard()->set_lower_s(0.01);
  onboard_ = OnboardProcess::start(robot, folder_, "", error, folder_ + "/robot");
  if (!onboard_) return false;
  watch_ = std::make_unique<Watch>(onboard_->ring());
  client_ = link::Client::connect(config(anna_), error);
  if (!client_ || !client_->take_baton(error)) return false;
  v1::Command confirm;
  confirm.mutable_confirm_first_start()->set_robot_sha256_hex(files::hex(onboard_->robot().sha256()));
  confirm.mutable_confirm_first_start()->set_read_procedure(true);
  confirm.mutable_confirm_first_start()->set_who("bench");
  return accepted(confirm, error);
}

bool Bench::accepted(const v1::Command& command, std::string& error) {
  const std::optional<v1::Answer> answer = client_->ask(command);
  error = answer ? answer->words() : client_->trouble();
  if (answer && answer->accepted()) error.clear();
  return error.empty();
}

// Released if need be, walked until torque was seen, stopped, and released again. `bytes` is the walk as it
// went out.
bool Bench::rightful_walk(std::string& bytes, std::string& error) {
  v1::Command release;
  (void)release.mutable_release();
  (void)client_->ask(release);
  v1::Command walk;
  walk.set_format(1);
  walk.set_id(fmt::format("rightful-{}", random_()));
  walk.set_operator_name("operator");
  walk.set_baton(client_->baton());
  walk.mutable_walk()->set_duration_s(5.0);
  const std::uint64_t before = watch_->moved();
  if (!until([&] { return accepted(walk, error) || error.find("refused") == std::string::npos; }) ||
      !error.empty()) {
    return false;
  }
  bytes = walk.SerializeAsString();
  if (!until([&] { return watch_->moved() > before; })) {
    error = "the rightful operator's walk did not move the robot";
    return false;
  }
  v1::Command stop;
  (void)stop.mutable_stop();
  const std::optional<v1::Answer> stopped = client_->ask(stop);
  if (!stopped || !stopped->confirmed() || !until([&] { return !watch_->torque_on(); })) {
    error = "the rightful operator's stop was not confirmed";
    return false;
  }
  return until([&] { return accepted(release, error); });
}

v1::Command Bench::motion(std::uint64_t baton) {
  v1::Command command;
  command.set_format(1);
  command.set_id(fmt::format("{:x}", random_()));
  command.set_operator_name("anna");
  command.set_baton(baton);
  switch (random_() % 7) {
    case 0:
      command.mutable_walk()->set_duration_s(2.0);
      break;
    case 1:
      (void)command.mutable_go();
      break;
    case 2:
      (void)command.mutable_release();
      break;
    case 3:
      (void)command.mutable_resume();
      break;
    case 4:
      command.mutable_start_session()->set_plan_text("name: \"abuse\"");
      break;
    case 5:
      (void)command.mutable_take_baton();
      break;
    default:
      (void)command.mutable_sign_of_life();
      break;
  }
  return command;
}

std::string Bench::damage(std::string bytes) {
  switch (random_() % 3) {
    case 0:  // garbage
      bytes.resize(random_() % 300);
      for (char& c : bytes) c = static_cast<char>(random_());
      break;
    case 1:  // truncated
      bytes.resize(random_() % bytes.size());
      break;
    default:  // altered
      for (std::uint64_t flips = 1 + random_() % 4; flips > 0; --flips) {
        char& c = bytes[random_() % bytes.size()];
        c = static_cast<char>(c ^ static_cast<char>(1U << (random_() % 8)));
      }
  }
  return bytes;
}

void Bench::stranger(int messages) {
  link::ClientConfig as_stranger = config(stranger_);
  std::string error;
  const auto client = link::Client::connect(as_stranger, error);
  std::uint64_t answered = 0;
  for (int i = 0; client && i < messages; ++i) answered += client->ask(motion(client_->baton()), 200) ? 1 : 0;
  attacks_.push_back({"a key that is not listed", static_cast<std::uint64_t>(messages), answered});
}

void Bench::raw_bytes(int connections) {
  const int ports[]{onboard_->command_port(), onboard_->telemetry_port(), onboard_->fetch_port()};
  for (int i = 0; i < connections; ++i) {
    const int file = ::socket(AF_INET, SOCK_STREAM | SOCK_CLOEXEC, 0);
    sockaddr_in to{};
    to.sin_family = AF_INET;
    to.sin_port = htons(static_cast<std::uint16_t>(ports[i % 3]));
    to.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    if (::connect(file, reinterpret_cast<const sockaddr*>(&to), sizeof to) == 0) {
      std::string bytes(random_() % 400, '\0');
      for (char& c : bytes) c = static_cast<char>(random_());
      // Half of them begin as ZMTP 3 with CURVE should, so that the handshake is reached.
      if (i % 2 == 0)
        bytes.insert(0, std::string("\xff\0\0\0\0\0\0\0\0\x7f\x03\0CURVE", 17) + std::string(47, '\0'));
      [[maybe_unused]] const ssize_t sent =
          ::send(file, bytes.data(), bytes.size(), MSG_NOSIGNAL | MSG_DONTWAIT);
    }
    (void)::close(file);
  }
  attacks_.push_back({"raw bytes at the ports", static_cast<std::uint64_t>(connections), 0});
}

void Bench::observer(int messages) {
  Sender sender(screen_, onboard_->command_port());
  for (int i = 0; i < messages; ++i) sender.send(motion(client_->baton()).SerializeAsString());
  sender.finish();
  attacks_.push_back({"an observer with the true baton", sender.sent(), sender.answered()});
}

void Bench::stale_baton(int messages) {
  Sender sender(ben_, onboard_->command_port());
  for (int i = 0; i < messages; ++i) {
    const std::uint64_t mine = client_->baton();
    const std::uint64_t numbers[]{0, mine - 1, mine + 1, mine, random_()};
    sender.send(motion(numbers[random_() % 5]).SerializeAsString());
  }
  sender.finish();
  attacks_.push_back(
      {"an operator without, with a stale, with another's baton", sender.sent(), sender.answered()});
}

void Bench::replay(int messages, const std::string& bytes) {
  Sender sender(anna_, onboard_->command_port());
  // Some while the link itself remembers the id; then more commands (refused) than it remembers, so that
  // the rest is for the journal to recognise.
  for (int i = 0; i < messages / 4; ++i) sender.send(bytes);
  for (int i = 0; i < messages / 2; ++i) sender.send(motion(client_->baton() - 1).SerializeAsString());
  sender.send(bytes);
  sender.finish();  // while one waits for the journal, the same again shares its answer
  for (int i = 1; i < messages / 4; ++i) sender.send(bytes);
  sender.finish();
  attacks_.push_back({"the holder's own walk replayed, soon and late", sender.sent(), sender.answered()});
}

void Bench::damaged(int messages, bool to_fetch) {
  Sender sender(ben_, to_fetch ? onboard_->fetch_port() : onboard_->command_port(), to_fetch ? 4 : 200);
  for (int i = 0; i < messages; ++i) {
    v1::Fetch fetch;
    fetch.mutable_telemetry()->set_to_sequence(random_() % 1000);
    sender.send(damage(to_fetch ? fetch.SerializeAsString() : motion(client_->baton()).SerializeAsString()));
  }
  sender.finish();
  attacks_.push_back(
      {to_fetch ? "garbage, truncated, altered fetches" : "garbage, truncated, altered commands",
       sender.sent(), sender.answered()});
}

void Bench::attack() {
  const int n = options_.messages;
  pause_ms(
      200);  // the watch is up to 20 ms behind: the last of the rightful walk is not counted as an attack's
  const std::uint64_t before = watch_->moved();
  stranger(std::max(1, n / 1000));
  raw_bytes(n / 50);
  observer(n / 5);
  stale_baton(n / 5);
  replay(n / 10, walk_bytes_);
  damaged(n / 20, true);
  damaged(n - n / 50 - 2 * (n / 5) - n / 10 - n / 20 - std::max(1, n / 1000), false);
  pause_ms(300);
  moved_ = watch_->moved() - before;
}

bool Bench::run(std::string& error) {
  if (!set_up(error) || !rightful_walk(walk_bytes_, error)) return false;
  attack();
  v1::Command status;
  (void)status.mutable_ask_status();
  alive_ = client_->ask(status).has_value() && onboard_->alive();
  std::string bytes;
  const bool moves = alive_ && client_->baton() != 0 && rightful_walk(bytes, error);
  report(moves, error);
  return true;
}

void Bench::report(bool moves_afterwards, const std::string& error) {
  std::uint64_t all = 0;
  for (const Attack& attack : attacks_) all += attack.messages;
  const std::string lost =
      watch_->missed() == 0 ? "" : fmt::format(", {} commands not seen", watch_->missed());
  promise(fmt::format("unauthorised attempts ({}): robot moved / died", all),
          fmt::format("{} / {}{}{}", moved_, alive_ ? 0 : 1, lost,
                      moves_afterwards ? "" : ", and the rightful operator cannot move it either"),
          "0 / 0", moved_ == 0 && alive_ && watch_->missed() == 0 && moves_afterwards);
  for (const Attack& attack : attacks_) {
    printed(attack.name, fmt::format("{} messages, {} answered", attack.messages, attack.answered));
  }
  printed("rightful operator afterwards", moves_afterwards ? "walks and stops" : error);
  printed("drive commands watched", std::to_string(watch_->seen()));
}

}  // namespace
}  // namespace pastern::bench

int main(int argc, char** argv) {
  using namespace pastern::bench;
  Options options;
  CLI::App app{"Attempts to move the robot by whoever may not"};
  app.add_option("--messages", options.messages, "how many")->check(CLI::Range(1000, 10'000'000));
  app.add_option("--seed", options.seed, "of the messages");
  CLI11_PARSE(app, argc, argv);
  const std::string folder =
      (std::filesystem::temp_directory_path() / fmt::format("pastern_link_abuse_{}", getpid())).string();
  std::filesystem::create_directories(folder);
  std::string error;
  const bool measured = Bench(options, folder).run(error);
  std::filesystem::remove_all(folder);
  if (measured) return 0;
  promise("unauthorised attempts: robot moved / died", error, "0 / 0", false);
  return 1;
}
