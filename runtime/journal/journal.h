// The durable record: SQLite, WAL, synchronous FULL. A walk is on disk before the next begins. Session thread
// only. Schema: runtime/journal/schema.sql (documented there, versioned; another version is refused). Any
// SQLite tool opens it. What was read is checked against its SHA-256: a journal that was changed or damaged
// is refused when it is opened.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/link.pb.h"
#include "runtime/types/episode.h"

namespace pastern::journal {

/// A journal that failed to write stays failed: every later write returns the first failure's words.
struct [[nodiscard]] Written {
  bool ok{false};
  std::string words;  ///< one line when not ok: what failed, where
};

struct SessionRow {
  std::uint64_t session{0};
  std::string plan_text;
  std::string robot_sha256_hex;
  std::string start_policy_sha256_hex;      ///< of the file's bytes
  std::string start_parameters_sha256_hex;  ///< of the parameters, as parameters_sha256() gives it
  std::string candidate_sha256_hex;         ///< offered candidate, or empty
  bool ended{false};
  std::string software;
};

struct FirstStart {
  std::string robot_sha256_hex;
  std::string who;
  std::string when_utc;
};

struct Adoption {
  std::string policy_sha256_hex;
  std::string who;
  std::string when_utc;
  std::string words;  ///< why; kWentBack for a step back
};

inline constexpr const char* kWentBack = "gone back to";

/// SHA-256 of the parameters as little-endian IEEE 754 doubles, in their order: 32 bytes.
[[nodiscard]] std::string parameters_sha256(const Parameters& parameters);

/// A command that was carried out. The same id under another key is another command.
struct CommandRow {
  std::string key;  ///< public key of who sent it; empty without keys
  std::string id;
  std::string command_sha256_hex;  ///< of what it asks for, so that another command under its id is noticed
  std::string answer;              ///< bytes of the v1::Answer
};

/// Key of put() and get() under which the onboard program writes when, on what and by whom a session was
/// begun: "2026-01-31T12:00:00Z, simulated robot, stepped pace, by ida".
[[nodiscard]] inline std::string begun_key(std::uint64_t session) {
  return "begun." + std::to_string(session);
}

/// Key of put() and get() for the drives on which a session was begun: what the plug-in calls itself, a line
/// end, its settings as they were given.
[[nodiscard]] inline std::string drives_key(std::uint64_t session) {
  return "drives." + std::to_string(session);
}

class Journal {
 public:
  /// Opens or creates `folder`/pastern.journal. Null with one line in `error`: not a folder, older or newer
  /// schema, not a journal, damaged, locked by another process, disk full. `vfs` names an SQLite VFS (tests),
  /// empty for the default. `read_only`: takes no lock, creates nothing, and `folder` may be the journal file
  /// itself (a copy, say). An empty file counts as a new journal: a power cut while it is made leaves one.
  [[nodiscard]] static std::unique_ptr<Journal> open(const std::string& folder, std::string& error,
                                                     const std::string& vfs = "", bool read_only = false);
  ~Journal();

  /// First failure's words, of a write or of a read; empty while all is well. After a failure nothing is
  /// written any more and what is read is not to be relied on.
  [[nodiscard]] const std::string& failure() const;

  // Sessions.
  [[nodiscard]] Written begin_session(SessionRow& row);  // fills row.session
  [[nodiscard]] std::optional<SessionRow> last_session() const;
  [[nodiscard]] std::vector<SessionRow> sessions() const;  // oldest first
  /// Once a session. Refused for a session that has ended.
  [[nodiscard]] Written end_session(std::uint64_t session, const v1::Verdict& verdict);
  /// What end_session() was given.
  [[nodiscard]] std::optional<v1::Verdict> verdict(std::uint64_t session) const;

  /// One transaction: the episode, the parameters it walked, and the simulated robot's carried state (empty:
  /// stays as it was). The returned value is the proof that an operator wants; nothing when the write failed
  /// (words in `why`). The walk's number is the session's last one plus 1; session 0 takes walks outside
  /// sessions. `terms.total` and `parameters_sha256` are filled in here.
  [[nodiscard]] std::optional<Committed<Evaluation>> commit(const v1::Episode& episode,
                                                            const Parameters& parameters,
                                                            const std::string& robot_state, std::string& why);
  /// All finished walks of a session in order, as proofs, for replay. Void ones are included; the caller
  /// skips them.
  struct Finished {
    v1::Episode episode;
    Committed<Evaluation> evaluation;
  };
  [[nodiscard]] std::vector<Finished> finished(std::uint64_t session) const;
  /// Number of the last finished walk; 0 when none.
  [[nodiscard]] std::uint64_t last_walk(std::uint64_t session) const;
  /// The last finished walk does not count, on the operator's word. Refused for an earlier walk (the next has
  /// begun to build on it), for one that is void already, and after the session's end.
  [[nodiscard]] Written mark_void(std::uint64_t session, std::uint64_t walk, const std::string& reason);
  /// By SHA-256, as 32 bytes or as hex.
  [[nodiscard]] std::optional<Parameters> parameters(const std::string& sha256) const;
  /// Carried state of the simulated robot after the last finished walk of any session; nothing when none.
  [[nodiscard]] std::optional<std::string> robot_state() const;
  /// Gate's thermal state and other small named values that survive a restart.
  [[nodiscard]] Written put(const std::string& key, const std::string& value);
  [[nodiscard]] std::optional<std::string> get(const std::string& key) const;

  // Policies (file bytes by SHA-256 of the bytes) and what is current.
  /// The bytes must have that sum. Storing it again changes nothing.
  [[nodiscard]] Written store_policy(const std::string& bytes, const std::string& sha256_hex);
  [[nodiscard]] std::optional<std::string> policy(const std::string& sha256_hex) const;
  /// The policy must have been stored.
  [[nodiscard]] Written adopt(const Adoption& adoption);
  [[nodiscard]] std::vector<Adoption> adoptions() const;  // oldest first

  // Operators' acts.
  [[nodiscard]] Written confirm_first_start(const FirstStart& first);
  [[nodiscard]] std::optional<FirstStart> first_start(const std::string& robot_sha256_hex) const;
  /// Once a key and id; command() gives it back, also after a restart.
  [[nodiscard]] Written remember_command(const CommandRow& command);
  [[nodiscard]] std::optional<CommandRow> command(const std::string& key, const std::string& id) const;
  /// Telemetry that must be fetchable for ever (episodes, verdicts, notes), by sequence.
  [[nodiscard]] Written store_telemetry(const v1::Telemetry& telemetry);
  [[nodiscard]] std::vector<v1::Telemetry> telemetry(std::uint64_t from, std::uint64_t to) const;
  [[nodiscard]] std::uint64_t last_sequence() const;
  /// A line in the record: trips, releases, resumptions, with the robot's time.
  [[nodiscard]] Written note(std::uint64_t session, const std::string& words);
  [[nodiscard]] std::vector<std::string> notes(std::uint64_t session) const;  // oldest first

  /// SHA-256 in hex over the session's plan, files, walks, returns, parameters and verdict in order; not wall
  /// times, not notes or resume marks, not the session's number.
  [[nodiscard]] std::string digest(std::uint64_t session) const;
  /// A consistent copy of the whole database as the bytes of a plain file (sqlite3_serialize; not in WAL
  /// mode, so that it opens anywhere, from a read-only medium too). Empty when it failed.
  [[nodiscard]] std::string snapshot() const;

 private:
  Journal();
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::journal
