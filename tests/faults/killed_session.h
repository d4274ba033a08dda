// A session of the real onboard program, driven over the link at stepped pace, in which the program is killed
// again and again at random times and started anew.
#pragma once

#include <sys/types.h>

#include <cstdint>
#include <functional>
#include <string>

#include "runtime/link/client.h"

namespace pastern::faults {

struct OnboardFiles {
  std::string program;  ///< path of pastern-onboard
  std::string robot;
  std::string policy;
  std::string plugin;
  std::string scenario;
};

/// One process of the onboard program.
class Onboard {
 public:
  Onboard() = default;
  ~Onboard();
  Onboard(const Onboard&) = delete;
  Onboard& operator=(const Onboard&) = delete;

  /// Returns when it says that it is ready. False with its last line in `why`.
  [[nodiscard]] bool start(const OnboardFiles& files, const std::string& folder, std::uint64_t seed,
                           std::string& why);
  void kill_now();                     ///< SIGKILL, and waits for the end
  [[nodiscard]] bool stop_in_order();  ///< SIGTERM; true when it ended with 0
  [[nodiscard]] const link::ClientConfig& ports() const { return ports_; }

 private:
  pid_t process_{-1};
  int output_{-1};
  link::ClientConfig ports_;
};

struct KillResult {
  std::uint64_t kills{0};
  std::uint64_t during_walks{0};  ///< of them, between the first and the last finished walk
  std::uint64_t walks_lost{0};    ///< published as finished, and not in the journal after the kill
  std::uint64_t unreadable{0};
  std::uint64_t walks{0};  ///< finished in the end
  std::string digest;      ///< of the ended session
  std::string trouble;     ///< why the session did not come to its end; empty when it did
  double seconds{0};
};

/// Runs one session to its verdict in `folder` (empty at first). `delay_s` gives the time from the start or
/// resumption of the session to the next kill; negative: no more kills.
[[nodiscard]] KillResult run_killed_session(const OnboardFiles& files, const std::string& folder,
                                            const std::string& plan_text, std::uint64_t seed,
                                            const std::function<double()>& delay_s);

/// Sums over sessions.
struct KillTally {
  KillResult sum;
  std::uint64_t sessions{0};
  std::uint64_t different{0};  ///< sessions whose digest is not that of the uninterrupted one
  std::uint64_t walks{0};      ///< of the uninterrupted session
};

/// An uninterrupted session, then sessions killed up to twelve times each until there were `kills`. `seed`:
/// of the simulated robot and of the times. Folders are made and removed under the system's temporary one.
/// False when the uninterrupted session did not come to its end (told on stderr).
[[nodiscard]] bool kill_many(const OnboardFiles& files, std::uint64_t kills, std::uint64_t seed,
                             KillTally& tally);

/// The files of a shipped robot and scenario, and the built program.
[[nodiscard]] OnboardFiles shipped_files(const std::string& source, const std::string& binary,
                                         const std::string& robot, const std::string& scenario);

}  // namespace pastern::faults
