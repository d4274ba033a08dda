// A session of twelve walks as the journal sees it, with every other call in between, that can be continued
// from whatever a power cut left. Keeps what the journal acknowledged.
#pragma once

#include <string>
#include <vector>

#include "runtime/journal/journal.h"

namespace pastern::faults {

/// What came back as written, in order; none of it may be missing later.
struct Acknowledged {
  std::uint64_t session{0};
  std::vector<std::string> walks;  ///< serialised episodes
  std::uint64_t voided{0};         ///< number of the walk marked void, 0 = none
  std::uint64_t robot_state_of{0};
  std::uint64_t value_of{0};
  std::vector<std::string> commands;
  std::uint64_t telemetry{0};
  bool policy{false};
  bool adopted{false};
  bool first_start{false};
  bool ended{false};
};

/// Goes on from the journal's own record to the end of the session. False when a write failed.
[[nodiscard]] bool continue_session(journal::Journal& journal, Acknowledged& acknowledged);

/// Empty when everything acknowledged is there; else one line that says what is not.
[[nodiscard]] std::string missing(const journal::Journal& journal, const Acknowledged& acknowledged);

/// One cut at the n-th sync of the session, then reopening, then the rest. Counts what the promise is about.
struct CutResult {
  bool cut{false};  ///< false: the session has fewer syncs
  bool unreadable{false};
  std::string lost;          ///< from missing()
  bool other_result{false};  ///< the continued session's digest is not that of the uninterrupted one
};

/// `seed` decides what the cut leaves. Also counts syncs of the uninterrupted session (n = 0).
class PowerCutTrial {
 public:
  explicit PowerCutTrial(std::string folder);
  [[nodiscard]] std::uint64_t syncs() const { return syncs_; }
  [[nodiscard]] CutResult cut(std::uint64_t n, unsigned tear, std::uint64_t seed);

 private:
  std::string folder_;
  std::uint64_t syncs_{0};
  std::string digest_;
};

}  // namespace pastern::faults
