// The course of a session, from its plan to its verdict. What the adaptation learns comes out of the
// journal's commit; the walks themselves are in runner_walk.cpp.
#include "runtime/session/runner.h"

#include <algorithm>
#include <utility>

#include "proto/files/plan_file.h"
#include "runtime/policy/policy.h"

namespace pastern::session {
namespace {

std::string words_of(const std::string& what, const journal::Written& written) {
  return what + ": " + written.words + "; no further walk";
}

Parameters parameters_of(const files::PolicyFile& file) {
  const auto& parameters = file.policy().parameters();
  return {parameters.begin(), parameters.end()};
}

SessionStart start_of(const SessionSetup& setup) {
  SessionStart start{setup.plan, parameters_of(setup.start), policy::groups_of(setup.start.policy()), {}};
  if (setup.candidate) start.candidate = parameters_of(*setup.candidate);
  return start;
}

// Same network on the same observation and actions: parameters of one may stand in for those of the other.
bool same_structure(v1::Policy a, v1::Policy b) {
  for (v1::Policy* policy : {&a, &b}) {
    policy->clear_name();
    policy->clear_parameters();
    policy->clear_provenance();
  }
  return a.SerializeAsString() == b.SerializeAsString();
}

}  // namespace

Runner::Runner(const files::RobotFile& robot, Mover& mover, journal::Journal& journal, Hooks& hooks)
    : robot_(robot), mover_(mover), journal_(journal), hooks_(hooks), robot_sha_(files::hex(robot.sha256())) {
  recall_last_session();
  recall_trip();
  const std::optional<std::string> bytes = journal_.robot_state();
  if (!bytes || bytes->empty()) return;
  v1::CarriedState state;
  if (!state.ParseFromString(*bytes) || !mover_.restore(state)) {
    restore_failure_ = "the journal's carried state of the simulated robot was refused by it";
    return;
  }
  carried_ = state;
}

Runner::~Runner() = default;

std::string Runner::first_start_missing() const {
  if (journal_.first_start(robot_sha_)) return "";
  return "first start with robot file " + robot_.path() + " (sha256 " + robot_sha_ +
         "): read the first-start procedure, then confirm it (pastern confirm)";
}

std::string Runner::refusal_of(const SessionSetup& setup) const {
  const std::string missing = first_start_missing();
  if (!missing.empty()) return missing;
  if (!journal_.failure().empty()) return journal_.failure();
  if (setup.candidate && !same_structure(setup.start.policy(), setup.candidate->policy())) {
    return "candidate policy: its channels, layers, legs, rates or groups differ from the start policy's";
  }
  return refusal(start_of(setup));
}

std::uint64_t Runner::interrupted_session() const {
  const std::optional<journal::SessionRow> row = journal_.last_session();
  return row && !row->ended ? row->session : 0;
}

Ended Runner::run(const SessionSetup& setup) {
  const std::string refused = refusal_of(setup);
  if (!refused.empty()) return {Ended::How::refused, refused};
  journal::SessionRow row;
  row.plan_text = setup.plan_text;
  row.robot_sha256_hex = robot_sha_;
  row.start_policy_sha256_hex = files::hex(setup.start.sha256());
  row.start_parameters_sha256_hex = files::hex(journal::parameters_sha256(parameters_of(setup.start)));
  row.software = software();
  journal::Written written = journal_.store_policy(setup.start.bytes(), row.start_policy_sha256_hex);
  if (written.ok && setup.candidate) {
    row.candidate_sha256_hex = files::hex(setup.candidate->sha256());
    written = journal_.store_policy(setup.candidate->bytes(), row.candidate_sha256_hex);
  }
  if (written.ok) written = journal_.begin_session(row);
  if (!written.ok) return {Ended::How::failed, words_of("session not begun", written)};
  hooks_.on_begun(row.session);
  clock_base_ns_ = 0;
  if (!begin(setup, row.session)) return leave_session(Ended::How::interrupted, "the record does not fit");
  return loop();
}

Ended Runner::resume() {
  const std::optional<journal::SessionRow> row = journal_.last_session();
  if (!row || row->ended) return {Ended::How::refused, "no interrupted session; start one (pastern start)"};
  std::string words = first_start_missing();
  if (!words.empty()) return {Ended::How::refused, words};
  const std::optional<SessionSetup> setup = recorded_setup(*row, words);
  if (!setup) return {Ended::How::refused, words};
  clock_base_ns_ = journal_.last_walk(row->session) > 0 ? carried_.session_ns() : 0;
  if (!begin(*setup, row->session)) {
    (void)leave_session(Ended::How::refused, "");
    return {Ended::How::refused,
            "session " + std::to_string(row->session) +
                ": its walks do not fit its plan; the record was made by another software"};
  }
  say("session " + std::to_string(number_) + " goes on after walk " + std::to_string(session_->walks_done()));
  return loop();
}

std::optional<SessionSetup> Runner::recorded_setup(const journal::SessionRow& row, std::string& words) const {
  if (row.robot_sha256_hex != robot_sha_) {
    words = "the interrupted session used the robot file with sha256 " + row.robot_sha256_hex + ", found " +
            robot_sha_ + "; start the program with that file";
    return std::nullopt;
  }
  files::Defects defects;
  const auto stored = [&](const std::string& sha) -> std::optional<files::PolicyFile> {
    const std::optional<std::string> bytes = journal_.policy(sha);
    if (!bytes) return std::nullopt;
    return files::parse_policy(*bytes, "policy " + sha, robot_, defects);
  };
  const std::optional<v1::Plan> plan = files::parse_plan(row.plan_text, "recorded plan", defects);
  std::optional<files::PolicyFile> start = stored(row.start_policy_sha256_hex);
  std::optional<files::PolicyFile> candidate;
  if (!row.candidate_sha256_hex.empty()) candidate = stored(row.candidate_sha256_hex);
  if (!plan || !start || (!row.candidate_sha256_hex.empty() && !candidate)) {
    words = "the interrupted session's plan or policy cannot be read from the journal";
    if (!defects.empty()) words += ": " + defects.front().line();
    return std::nullopt;
  }
  return SessionSetup{*plan, row.plan_text, std::move(*start), std::move(candidate)};
}

bool Runner::begin(const SessionSetup& setup, std::uint64_t number) {
  setup_ = std::make_unique<SessionSetup>(setup);
  number_ = number;
  go_ = end_ = pause_ = false;
  voidable_ = 0;
  by_operator_ = setup.plan.go_by() != v1::Plan::AUTO || !mover_.simulated();
  mover_.change_policy(setup.start.policy());
  clock_origin_ns_ = mover_.report().now.value;
  std::string words;
  return replay(words);
}

// Also after an operator declared a finished walk void: the state machine is told the record anew.
bool Runner::replay(std::string& words) {
  SessionStart start = start_of(*setup_);
  words = refusal(start);
  if (!words.empty()) return false;
  session_ = std::make_unique<Session>(std::move(start));
  for (const journal::Journal::Finished& walk : journal_.finished(number_)) {
    const double ended_s = walk.episode.started_s() + walk.episode.summary().duration_s();
    if (!session_->next() || !session_->take(walk.evaluation, ended_s)) {
      words = "walk " + std::to_string(walk.episode.walk()) + " does not fit";
      return false;
    }
  }
  return true;
}

Ended Runner::loop() {
  Ended ended;
  while (true) {
    // At operator pace the verdict waits for a go as well: until then the last walk may be declared void.
    if (!allowed(by_operator_, ended)) return ended;
    if (!session_->next()) break;
    const Order order = *session_->next();
    acted_ = false;
    if (!make_ready(order, ended)) return ended;
    if (!acted_ && !perform(order, ended)) return ended;
  }
  return conclude(*session_->verdict());
}

Ended Runner::walk(const files::PolicyFile& policy, double duration_s, std::uint64_t draw) {
  const std::string missing = first_start_missing();
  if (!missing.empty()) return {Ended::How::refused, missing};
  if (!journal_.failure().empty()) return {Ended::How::failed, journal_.failure()};
  number_ = 0;
  pause_ = end_ = false;
  by_operator_ = true;
  mover_.change_policy(policy.policy());
  clock_base_ns_ = 0;
  clock_origin_ns_ = mover_.report().now.value;
  Order order;
  order.walk = journal_.last_walk(0) + 1;
  order.part = Part::single;
  order.duration_s = duration_s;
  order.draw = draw;
  order.parameters = parameters_of(policy);
  Ended ended;
  acted_ = false;
  if (!allowed(false, ended) || !make_ready(order, ended)) return ended;
  if (acted_) {
    return leave_session(Ended::How::refused,
                         "stopped, or without the baton, before the walk began; ask for it again");
  }
  if (!perform(order, ended)) return ended;
  return {Ended::How::verdict, "walk " + std::to_string(order.walk) + " is recorded"};
}

// Everything that a person has a say in. False: the session is left, `ended` says how.
bool Runner::allowed(bool by_operator, Ended& ended) {
  go_ = false;
  while (true) {
    hooks_.serve();
    if (interrupted(ended)) return false;
    if (mover_.signals().baton_lost.load(std::memory_order_acquire)) {
      if (!wait_for("baton", ended)) return false;
      go_ = false;
    } else if (tripped() && !releases_itself(mover_.report().trip)) {
      if (!wait_for("release", ended)) return false;
      go_ = false;
    } else if (by_operator && !go_) {
      if (!wait_for("go", ended)) return false;
    } else {
      return true;
    }
  }
}

bool Runner::interrupted(Ended& ended) {
  waiting_for_.clear();
  if (!journal_.failure().empty()) {
    ended = leave_session(Ended::How::failed, "journal: " + journal_.failure() + "; no further walk");
  } else if (hooks_.leave() || pause_) {
    ended =
        leave_session(Ended::How::interrupted, "session left before its verdict; resume it (pastern resume)");
  } else if (end_ && session_) {
    ended = conclude(session_->ended_by_operator());
  } else {
    return false;
  }
  return true;
}

bool Runner::wait_for(const std::string& what, Ended& ended) {
  waiting_for_ = what;
  acted_ = acted_ || what != "go";
  state_ = tripped() ? v1::TRIPPED : v1::PARKED;
  keep_trip();
  if (hooks_.wait(what)) return true;
  ended = leave_session(Ended::How::interrupted, "nobody there to act: waiting for " + what);
  return false;
}

Ended Runner::conclude(v1::Verdict verdict) {
  journal::Written written = store_adapted(verdict);
  if (written.ok) written = journal_.end_session(number_, verdict);
  if (!written.ok) return leave_session(Ended::How::failed, words_of("verdict not recorded", written));
  hooks_.on_verdict(verdict);
  v1::Status status;
  fill(status);
  *status.mutable_verdict() = verdict;
  status.set_session_part(v1::ENDED);
  Ended ended = leave_session(Ended::How::verdict, verdict.words());
  last_ = status;
  return ended;
}

// The parameters that were confirmed, or failed to be, as a policy file in the journal.
journal::Written Runner::store_adapted(v1::Verdict& verdict) {
  const Parameters& adapted = session_->adapted();
  v1::Policy policy = setup_->start.policy();
  const bool same =
      std::equal(adapted.begin(), adapted.end(), policy.parameters().begin(), policy.parameters().end());
  if (verdict.pairs() == 0 || same) return {true, ""};
  policy.mutable_parameters()->Assign(adapted.begin(), adapted.end());
  v1::Provenance& from = *policy.mutable_provenance();
  from.set_parent_sha256(files::raw(setup_->start.sha256()));
  from.set_made_by("session");
  from.set_seed(setup_->plan.seed());
  from.set_walks(session_->walks_done());
  from.set_text("plan " + setup_->plan.name() + "; " + verdict.words());
  from.set_software(software());
  const std::string bytes = files::pack_policy(policy);
  const files::Sha256 sum = files::sha256(bytes);
  verdict.set_adapted_sha256(files::raw(sum));
  return journal_.store_policy(bytes, files::hex(sum));
}

Ended Runner::leave_session(Ended::How how, const std::string& words) {
  if (session_) {
    last_.Clear();
    fill(last_);
    if (how != Ended::How::verdict) last_.set_session_part(v1::INTERRUPTED);
    if (!words.empty()) say(words);
  }
  release_at_end();
  session_.reset();
  setup_.reset();
  number_ = 0;
  voidable_ = 0;
  waiting_for_.clear();
  by_operator_ = true;
  keep_trip();
  state_ = tripped() ? v1::TRIPPED : v1::PARKED;
  return {how, words};
}

journal::Written Runner::end_interrupted(const std::string& words) {
  v1::Verdict verdict;
  verdict.set_kind(v1::Verdict::KEEP);
  verdict.set_p_value(1);
  verdict.set_rule("no confirmation");
  verdict.set_words(words);
  const journal::Written written = journal_.end_session(interrupted_session(), verdict);
  if (written.ok) {
    recall_last_session();
    hooks_.on_verdict(verdict);
  }
  return written;
}

bool Runner::mark_void(std::uint64_t walk, const std::string& reason, std::string& words) {
  if (!session_) {
    words = "no session is running; only a walk of a running session can be declared void";
    return false;
  }
  const std::string mark = reason.empty() ? "operator's mark" : reason;
  if (walking_ != 0 && walk == walking_) {
    void_mark_ = mark;
    words = "walk " + std::to_string(walk) + " will be void when it ends, and is walked again";
    return true;
  }
  if (voidable_ == 0 || walk != voidable_ || moving_) {
    words = "walk " + std::to_string(walk) + " can no longer be declared void; expected " +
            (voidable_ != 0 ? "walk " + std::to_string(voidable_) : "the walk in progress") +
            " (a walk can be until the next begins)";
    return false;
  }
  const journal::Written written = journal_.mark_void(number_, walk, mark);
  if (!written.ok || !replay(words)) {
    if (!written.ok) words = written.words;
    return false;
  }
  voidable_ = 0;
  for (const journal::Journal::Finished& finished : journal_.finished(number_)) {
    if (finished.episode.walk() == walk) hooks_.on_episode(finished.episode);
  }
  words = "walk " + std::to_string(walk) + " is void and will be walked again";
  return true;
}

void Runner::rest() {
  if (mover_.pace() == Pace::stepped && !moving_) (void)move(Motion::parked, 0, state_);
  if (tripped()) state_ = v1::TRIPPED;
}

}  // namespace pastern::session
