// Runs walks: strings Session, Mover and Journal together. The same runner serves the onboard program and, in
// process, benches and rehearsal. Session thread only; everything here may take its time.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/link.pb.h"
#include "pastern/v1/plan.pb.h"
#include "proto/files/policy_file.h"
#include "proto/files/robot_file.h"
#include "runtime/journal/journal.h"
#include "runtime/session/mover.h"
#include "runtime/session/session.h"

namespace pastern::session {

/// "pastern 0.1.0", as it stands in journals and policy files.
[[nodiscard]] const std::string& software();

/// What the runner's surroundings do for it. The defaults suit a bench: nobody there, nothing to wait for.
class Hooks {
 public:
  virtual ~Hooks() = default;
  /// Called between motions and, at wall pace, some hundred times a second within them.
  virtual void serve() {}
  /// The robot stands still until somebody acts ("go", "release", "baton"). Serves, returns after a moment.
  /// False: nobody will; the session is left as it is.
  virtual bool wait(const std::string& what) {
    (void)what;
    return false;
  }
  /// True: leave the session in order as soon as the robot is parked.
  [[nodiscard]] virtual bool leave() { return false; }
  /// A new session is in the journal; its first walk has not begun.
  virtual void on_begun(std::uint64_t session) { (void)session; }
  virtual void on_episode(const v1::Episode& episode) { (void)episode; }
  virtual void on_verdict(const v1::Verdict& verdict) { (void)verdict; }
  virtual void on_note(const std::string& words) { (void)words; }
};

struct SessionSetup {
  v1::Plan plan;          ///< checked
  std::string plan_text;  ///< as it came
  files::PolicyFile start;
  std::optional<files::PolicyFile> candidate;
};

/// verdict: to its end (a single walk: walked). interrupted: can be resumed. refused: nothing was done.
/// failed: the journal cannot be written; no further walk.
struct Ended {
  enum class How : std::uint8_t { verdict, interrupted, refused, failed };
  How how{How::refused};
  std::string words;
};

class Runner {
 public:
  /// All must outlive the runner. Restores what the journal says the robot carries over (heat, charge,
  /// thermal memory); why that failed is in restore_failure().
  Runner(const files::RobotFile& robot, Mover& mover, journal::Journal& journal, Hooks& hooks);
  ~Runner();
  Runner(const Runner&) = delete;
  Runner& operator=(const Runner&) = delete;

  [[nodiscard]] const std::string& restore_failure() const { return restore_failure_; }
  /// Why nothing may walk with this robot file in this journal folder yet, in words; empty when it may.
  [[nodiscard]] std::string first_start_missing() const;
  /// Why a session cannot begin, in words; empty when it can.
  [[nodiscard]] std::string refusal_of(const SessionSetup& setup) const;
  /// Number of the journal's last session if that has no verdict; 0 otherwise.
  [[nodiscard]] std::uint64_t interrupted_session() const;

  /// Each returns when the robot is parked (or tripped) again.
  [[nodiscard]] Ended run(const SessionSetup& setup);
  [[nodiscard]] Ended resume();
  /// One walk of a policy outside a session; recorded with session 0.
  [[nodiscard]] Ended walk(const files::PolicyFile& policy, double duration_s, std::uint64_t draw);

  /// Ends the journal's interrupted session as "keep", in these words.
  [[nodiscard]] journal::Written end_interrupted(const std::string& words);

  // For commands, from within the hooks or between runs; same thread.
  void go() { go_ = true; }
  void end() { end_ = true; }      ///< the session ends as "keep" as soon as the robot is parked
  void pause() { pause_ = true; }  ///< the session is left, to be resumed, as soon as the robot is parked
  /// The walk that is being walked, or the last one until the next begins. False with a reason in `words`.
  [[nodiscard]] bool mark_void(std::uint64_t walk, const std::string& reason, std::string& words);
  /// An operator's release of a trip. `stops_seen`: Signals::stops_asked when the operator asked for it; a
  /// stop that has come since is not cleared. It permits the next walk and does not start it: at operator
  /// pace a go is asked for anew, and a single walk has to be. False with a reason in `words`.
  [[nodiscard]] bool release(std::string& words, std::uint64_t stops_seen);
  [[nodiscard]] bool release(std::string& words) {
    return release(words, mover_.signals().stops_asked.load());
  }
  /// At stepped pace nothing ticks between orders: one parked tick, so that a stop or halt takes effect.
  void rest();
  /// At wall pace: keeps a trip that came while nothing was being done, so that a restart does not clear it.
  void notice() { keep_trip(); }

  [[nodiscard]] bool in_session() const { return session_ != nullptr; }
  [[nodiscard]] const std::string& waiting_for() const { return waiting_for_; }
  /// Fills in what the runner knows: robot state, session part, counts, returns, trip, verdict, figures.
  void fill(v1::Status& status);

 private:
  [[nodiscard]] bool begin(const SessionSetup& setup, std::uint64_t number);
  [[nodiscard]] Ended loop();
  [[nodiscard]] bool allowed(bool by_operator, Ended& ended);
  [[nodiscard]] bool interrupted(Ended& ended);
  [[nodiscard]] bool wait_for(const std::string& what, Ended& ended);
  [[nodiscard]] bool make_ready(const Order& order, Ended& ended);
  [[nodiscard]] bool out_of_trip(Ended& ended);
  [[nodiscard]] bool cool_down(Ended& ended);
  [[nodiscard]] bool perform(const Order& order, Ended& ended);
  MotionResult walk_through(const Order& order, std::string& void_reason);
  MotionResult move(Motion motion, double duration_s, v1::RobotState state);
  [[nodiscard]] v1::Episode episode_of(const Order& order, const MotionResult& result,
                                       std::int64_t started_ns) const;
  [[nodiscard]] std::optional<Committed<Evaluation>> commit(const v1::Episode& episode, const Order& order,
                                                            Ended& ended);
  [[nodiscard]] Ended conclude(v1::Verdict verdict);
  [[nodiscard]] journal::Written store_adapted(v1::Verdict& verdict);
  [[nodiscard]] bool replay(std::string& words);
  [[nodiscard]] std::optional<SessionSetup> recorded_setup(const journal::SessionRow& row,
                                                           std::string& words) const;
  [[nodiscard]] Ended leave_session(Ended::How how, const std::string& words);
  void say(const std::string& words);
  void recall_last_session();
  void tell_joints(const CycleReport& report, v1::Status& status) const;
  [[nodiscard]] std::int64_t session_ns();
  [[nodiscard]] bool tripped();
  [[nodiscard]] bool releases_itself(const safety::Trip& trip) const;
  [[nodiscard]] v1::TripRecord record_of(const safety::Trip& trip) const;
  void tell_fall(const BodyEstimate<>& body, v1::TripRecord& record) const;
  void recall_trip();
  void keep_trip();
  void release_at_end();
  [[nodiscard]] bool release_itself(std::string& words);

  const files::RobotFile& robot_;
  Mover& mover_;
  journal::Journal& journal_;
  Hooks& hooks_;
  std::string robot_sha_;
  std::string restore_failure_;
  v1::CarriedState carried_;  // as it was last written
  bool trip_kept_{false};     // the journal knows of the trip

  std::unique_ptr<SessionSetup> setup_;
  std::unique_ptr<Session> session_;
  std::uint64_t number_{0};  // of the session; 0 outside one
  std::int64_t clock_base_ns_{0};
  std::int64_t clock_origin_ns_{0};

  bool go_{false};
  bool end_{false};
  bool pause_{false};
  bool acted_{false};  // a person had to release or take the baton since the walk was agreed to
  bool moving_{false};
  bool by_operator_{true};     // pace: a person says go and releases
  std::uint64_t walking_{0};   // the walk in progress
  std::uint64_t voidable_{0};  // the finished walk that may still be declared void
  std::string void_mark_;
  v1::RobotState state_{v1::PARKED};
  std::string waiting_for_;
  v1::Status last_;  // session fields of the status after the session was left
};

}  // namespace pastern::session
