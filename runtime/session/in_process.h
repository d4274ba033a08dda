// A whole session in the caller's thread, at stepped pace, without sockets: for benches, rehearsal and tests.
// The same cycle, gate, session, runner and journal as on the robot.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "runtime/session/runner.h"

namespace pastern::session {

struct InProcess {
  const files::RobotFile* robot{nullptr};
  const files::PolicyFile* start{nullptr};
  const files::PolicyFile* candidate{nullptr};  ///< with OFFERED_CANDIDATE
  v1::Plan plan;
  std::string plugin;          ///< path of the simulated robot's shared object
  std::string plugin_options;  ///< "scenario=FILE", see the plug-in
  std::uint64_t plugin_seed{0};
  std::string journal_folder;  ///< kept; empty: a journal in a temporary folder that is removed
  std::string vfs;             ///< of SQLite, for tests
  bool resume{false};          ///< go on with the folder's interrupted session instead of starting one
  /// Told after each finished walk; false leaves the session, to be resumed.
  std::function<bool(const v1::Episode&)> after_walk;
};

struct InProcessResult {
  Ended ended;
  std::optional<v1::Verdict> verdict;
  std::vector<v1::Episode> episodes;  ///< finished in this call
  std::string digest;                 ///< of the session so far
  std::string adapted_bytes;          ///< policy file that the verdict names, or empty
};

/// Confirms the first start by itself when the robot is simulated; real drives are refused.
[[nodiscard]] InProcessResult run_session_in_process(const InProcess& given);

/// The drives' configuration that belongs to a robot file.
[[nodiscard]] hal::DrivesConfig drives_config(const files::RobotFile& robot, const std::string& plugin,
                                              const std::string& options, std::uint64_t seed, Pace pace);

}  // namespace pastern::session
