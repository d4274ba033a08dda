// See reach.h.
#include "tools/pastern/reach.h"

#include <fmt/format.h>
#include <signal.h>
#include <sys/stat.h>
#include <unistd.h>

#include <charconv>
#include <chrono>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <thread>

#include "proto/files/durable.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

namespace fs = std::filesystem;

std::string from_environment(const char* name, const std::string& otherwise) {
  const char* value = std::getenv(name);  // NOLINT(concurrency-mt-unsafe): read before any thread starts
  return value == nullptr || *value == '\0' ? otherwise : value;
}

/// The usual key folder when it holds a robot's public key; without one the link is open and on loopback
/// only.
std::string usual_keys() {
  const std::string home = from_environment("HOME", "");
  const std::string folder = home + "/.config/pastern/keys";
  return !home.empty() && access((folder + "/robot.public").c_str(), R_OK) == 0 ? folder : "";
}

constexpr int kBatonTries = 8;
constexpr std::chrono::milliseconds kBatonPause{100};

int to_ms(double seconds) { return static_cast<int>(seconds * 1000); }

}  // namespace

Reach::Reach()
    : host(from_environment("PASTERN_HOST", "127.0.0.1")),
      keys(from_environment("PASTERN_KEYS", usual_keys())),
      name(from_environment("PASTERN_NAME", from_environment("USER", "operator"))) {
  const std::string text = from_environment("PASTERN_PORT", "7741");
  int value = 0;
  const auto read = std::from_chars(text.data(), text.data() + text.size(), value);
  const bool whole = read.ec == std::errc() && read.ptr == text.data() + text.size();
  port = whole && value > 0 && value <= 65533 ? value : -1;  // -1 is refused when the line is opened
}

void Reach::options(Options& options) {
  options.text("--host", host, "Robot's address (environment: PASTERN_HOST)")
      .whole("--port", port, "Port for commands; telemetry and fetch are the next two (PASTERN_PORT)", 1,
             65533)
      .text("--keys", keys, "Folder of keys; empty: none, loopback only (PASTERN_KEYS)")
      .text("--name", name, "Who you are, for the record (PASTERN_NAME)")
      .number("--wait", wait_s, "Seconds to wait for an answer", 0.1, 600);
}

std::string Reach::endpoint() const { return fmt::format("{}:{}", host, port); }

std::unique_ptr<RobotLine> RobotLine::open(const Reach& reach, const std::string& verb, Exit& exit) {
  if (reach.port < 1) {
    complain(fmt::format("pastern {}: PASTERN_PORT: found '{}', expected a port, 1 to 65533", verb,
                         from_environment("PASTERN_PORT", "")));
    exit = Exit::usage;
    return nullptr;
  }
  std::unique_ptr<RobotLine> line(new RobotLine(reach, verb));
  link::ClientConfig config;
  config.host = reach.host;
  config.command_port = reach.port;
  config.telemetry_port = reach.port + 1;
  config.fetch_port = reach.port + 2;
  config.key_folder = reach.keys;
  config.operator_name = reach.name;
  std::string error;
  line->client_ = link::Client::connect(config, error);
  if (!line->client_) {
    complain(fmt::format("pastern {}: {}", verb, error));
    exit = reach.keys.empty() ? Exit::not_reached : Exit::file_wrong;
    return nullptr;
  }
  return line;
}

RobotLine::~RobotLine() {
  if (noted_) unlink(note_path().c_str());
  if (client_ && client_->baton() != 0) client_->give_baton();
}

std::optional<v1::Answer> RobotLine::ask_quietly(const v1::Command& command, double wait_s) {
  v1::Command sent = command;
  if (shared_baton_ != 0) sent.set_baton(shared_baton_);
  return client_->ask(sent, to_ms(wait_s));
}

Exit RobotLine::ask(const v1::Command& command, v1::Answer& answer) {
  const std::optional<v1::Answer> got = ask_quietly(command, reach_.wait_s);
  if (!got) {
    complain(fmt::format("pastern {}: no answer from {} within {:g} s: is pastern-onboard running there{}?",
                         verb_, reach_.endpoint(), reach_.wait_s,
                         reach_.keys.empty() ? "" : ", and is your key allowed"));
    return Exit::not_reached;
  }
  answer = *got;
  if (answer.accepted()) return Exit::done;
  const bool said = answer.words().rfind("refused", 0) == 0;
  complain(fmt::format("pastern {}: {}{}", verb_, said ? "" : "refused: ", answer.words()));
  const std::optional<v1::Answer> now =
      ask_quietly(command_of(&v1::Command::mutable_ask_status), reach_.wait_s);
  return now && now->status().robot_state() == v1::TRIPPED ? Exit::tripped : Exit::refused;
}

Exit RobotLine::status(v1::Status& status) {
  v1::Answer answer;
  const Exit exit = ask(command_of(&v1::Command::mutable_ask_status), answer);
  status = answer.status();
  return exit;
}

Exit RobotLine::hold_baton() {
  const std::uint64_t noted = noted_baton();
  if (noted != 0) {
    shared_baton_ = noted;
    const auto answer = ask_quietly(command_of(&v1::Command::mutable_sign_of_life), reach_.wait_s);
    if (answer && answer->accepted()) return Exit::done;
    shared_baton_ = 0;  // left by a process that has gone
  }
  v1::Status ignored;
  const Exit reached = status(ignored);
  if (reached != Exit::done) return reached;
  std::string why;
  // A ground tool that was killed holds the baton until it lapses.
  bool taken = client_->take_baton(why);
  for (int tries = 0; !taken && tries < kBatonTries; ++tries) {
    std::this_thread::sleep_for(kBatonPause);
    taken = client_->take_baton(why);
  }
  if (!taken) {
    const std::string said = why.rfind("refused: ", 0) == 0 ? why.substr(9) : why;
    complain(fmt::format("pastern {}: the baton was refused: {}", verb_, said));
    return Exit::refused;
  }
  note_baton();
  return Exit::done;
}

/// Where a process notes the baton it holds, for other verbs of the same person on this computer. The number
/// is of no use without the key that took it.
std::string RobotLine::note_path() const {
  const std::string folder = from_environment("XDG_RUNTIME_DIR", fmt::format("/tmp/pastern-{}", getuid()));
  return fmt::format("{}/pastern-baton-{}-{}", folder, reach_.host, reach_.port);
}

std::uint64_t RobotLine::noted_baton() const {
  struct stat info {};
  if (stat(note_path().c_str(), &info) != 0 || info.st_uid != getuid()) return 0;
  std::ifstream file(note_path());
  std::uint64_t number = 0;
  pid_t holder = 0;
  // Only a living process renews it.
  return file >> number >> holder && holder > 0 && kill(holder, 0) == 0 ? number : 0;
}

void RobotLine::note_baton() {
  std::error_code error;
  fs::create_directories(fs::path(note_path()).parent_path(), error);
  fs::permissions(fs::path(note_path()).parent_path(), fs::perms::owner_all, error);
  files::Defects defects;
  noted_ =
      files::write_durably(note_path(), fmt::format("{} {}\n", client_->baton(), getpid()), 0600, defects);
}

std::string trip_words(const v1::TripRecord& trip) {
  if (trip.cause().empty()) return "";
  if (trip.unit().empty() && trip.value() == 0 && trip.limit() == 0) {
    return fmt::format("{}, tick {}, reaction {}", trip.cause(), trip.tick(), trip.reaction());
  }
  const std::string joint = trip.joint().empty() ? "" : " of " + trip.joint();
  const std::string unit = trip.unit().empty() ? "" : " " + trip.unit();
  return fmt::format("{}{}: {:.3g}{}, limit {:.3g}{}, held {:.3g} s, tick {}, reaction {}", trip.cause(),
                     joint, trip.value(), unit, trip.limit(), unit, trip.held_s(), trip.tick(),
                     trip.reaction());
}

}  // namespace pastern::tools
