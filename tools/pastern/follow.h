// Following a session: one line a walk, progress and the estimated end, then the verdict. Main thread.
#pragma once

#include <chrono>
#include <optional>
#include <string>

#include "pastern/v1/link.pb.h"
#include "tools/pastern/reach.h"

namespace pastern::tools {

/// Names for people.
[[nodiscard]] std::string words(v1::Part part);
[[nodiscard]] std::string words(v1::Outcome outcome);
[[nodiscard]] std::string words(v1::RobotState state);
[[nodiscard]] std::string words(v1::SessionPart part);

/// False for a walk that was void before it began: it has no figures.
[[nodiscard]] bool walked(const v1::Episode& episode);

/// Head of the columns of walk_line().
[[nodiscard]] std::string walk_head();
/// One walk: number, part, outcome, return, speed, roll, heat, pack, and why it was void or tripped.
[[nodiscard]] std::string walk_line(const v1::Episode& episode);

/// The robot's own words: "verdict: adopt: ...".
[[nodiscard]] std::string verdict_line(const v1::Verdict& verdict);

/// What the robot walks on: "simulated robot, site cold_store", "real drives (NAME)". The site's name is that
/// of the scenario file in the plug-in's settings.
[[nodiscard]] std::string drives_words(bool simulated, const std::string& drives,
                                       const std::string& settings);
/// Name of the scenario in a simulated robot's settings; empty when they name none.
[[nodiscard]] std::string site_of(const std::string& settings);

/// "[=====     ] 34 of 76 walks, about 48 s to go".
class Progress {
 public:
  using Clock = std::chrono::steady_clock;
  /// The first call is where measuring begins: what was done before does not count for the pace, nor does
  /// time in which the session waits for a person (`waits`). The pace changes with each walk only.
  void update(std::uint64_t done, std::uint64_t planned, Clock::time_point now, bool waits = false);
  [[nodiscard]] std::string line() const;
  /// Nothing before a second walk was seen.
  [[nodiscard]] std::optional<double> seconds_to_go() const;

 private:
  std::optional<std::uint64_t> first_;
  Clock::time_point last_;
  double active_s_{0};  ///< since the first call, without waiting for people
  bool waited_{false};
  std::uint64_t done_{0};
  std::uint64_t planned_{0};
  double per_walk_s_{0};
};

struct FollowChoice {
  bool json{false};          ///< each message as one line of JSON
  bool quiet{false};         ///< the verdict only
  bool brief{false};         ///< progress without a line a walk
  bool commander{false};     ///< holds the baton: may say go, void, end; Ctrl-C stops the robot
  bool single{false};        ///< ends after one walk that is no part of a session
  bool forever{false};       ///< does not end with the session
  std::uint64_t session{0};  ///< the first number to follow; 0: any
  bool resumed{false};       ///< the session was begun before; it may be over already
  std::optional<std::uint64_t> walks_from;  ///< ends when more walks than these are done
};

/// Follows until the session has ended, was stopped, tripped, or `single` is satisfied. What the process
/// returns.
[[nodiscard]] Exit follow(RobotLine& line, const FollowChoice& choice);

/// Sends stop or halt until the robot confirms or `patience_s` is over, and says in words which it was.
[[nodiscard]] Exit press(RobotLine& line, bool halt, double patience_s);

/// The robot's own account of itself, one fact a line.
[[nodiscard]] std::string status_text(const v1::Status& status);

/// What to type next, from what the robot says of itself.
void suggest_after(const v1::Status& status);

}  // namespace pastern::tools
