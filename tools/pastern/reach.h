// The way to the robot: where it listens, with which keys, and asking it one thing. Main thread.
#pragma once

#include <cstdint>
#include <memory>
#include <string>

#include "pastern/v1/link.pb.h"
#include "runtime/link/client.h"
#include "tools/pastern/options.h"
#include "tools/pastern/verb.h"

namespace pastern::tools {

/// Options that every verb on the link has. Defaults: PASTERN_HOST, PASTERN_PORT, PASTERN_KEYS, PASTERN_NAME.
struct Reach {
  Reach();
  void options(Options& options);
  /// "127.0.0.1:7741"
  [[nodiscard]] std::string endpoint() const;

  std::string host;
  int port{7741};    ///< commands; telemetry and fetch are the next two
  std::string keys;  ///< folder; empty: no CURVE
  std::string name;  ///< of the operator, for the record
  double wait_s{3};
};

class RobotLine {
 public:
  /// Null after a complaint, with the exit status in `exit`.
  [[nodiscard]] static std::unique_ptr<RobotLine> open(const Reach& reach, const std::string& verb,
                                                       Exit& exit);
  ~RobotLine();

  /// Exit::done when accepted. Otherwise complains in one line: no answer -> not_reached; refused -> refused,
  /// or tripped when a trip is why.
  [[nodiscard]] Exit ask(const v1::Command& command, v1::Answer& answer);
  /// The same without a word, for verbs that have their own.
  [[nodiscard]] std::optional<v1::Answer> ask_quietly(const v1::Command& command, double wait_s);
  [[nodiscard]] Exit status(v1::Status& status);
  /// The baton of a `pastern start` that runs on this computer for the same robot, else one's own, renewed
  /// until this object goes.
  [[nodiscard]] Exit hold_baton();
  /// True when the baton is that of another process here.
  [[nodiscard]] bool baton_shared() const { return shared_baton_ != 0; }
  [[nodiscard]] link::Client& client() { return *client_; }
  [[nodiscard]] const Reach& reach() const { return reach_; }

 private:
  RobotLine(Reach reach, std::string verb) : reach_(std::move(reach)), verb_(std::move(verb)) {}
  [[nodiscard]] std::string note_path() const;
  [[nodiscard]] std::uint64_t noted_baton() const;
  void note_baton();

  Reach reach_;
  std::string verb_;
  std::unique_ptr<link::Client> client_;
  std::uint64_t shared_baton_{0};
  bool noted_{false};
};

/// For commands without content: command_of(&v1::Command::mutable_go).
template <class M>
[[nodiscard]] v1::Command command_of(M* (v1::Command::*what)()) {
  v1::Command command;
  (command.*what)();
  return command;
}

/// "tripped: pitch 0.93 rad, limit 0.90 rad, held 0.00 s, tick 18250, reaction ramp_down"
[[nodiscard]] std::string trip_words(const v1::TripRecord& trip);

}  // namespace pastern::tools
