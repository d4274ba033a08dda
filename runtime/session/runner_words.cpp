// What the runner tells: episodes, trips, status.
#include <algorithm>

#include "proto/files/plan_file.h"
#include "runtime/episode/recorder.h"
#include "runtime/session/runner.h"

namespace pastern::session {
namespace {

v1::Part part_of(Part part) { return static_cast<v1::Part>(static_cast<int>(part)); }
v1::Outcome outcome_of(Outcome outcome) { return static_cast<v1::Outcome>(static_cast<int>(outcome)); }

}  // namespace

const std::string& software() {
  static const std::string words = "pastern " PASTERN_VERSION;
  return words;
}

v1::TripRecord Runner::record_of(const safety::Trip& trip) const {
  v1::TripRecord record;
  record.set_cause(safety::name(trip.cause));
  if (trip.joint >= 0 && trip.joint < robot_.joint_count()) {
    record.set_joint(robot_.robot().joints(trip.joint).name());
  }
  record.set_value(trip.value);
  record.set_limit(trip.limit);
  record.set_held_s(trip.held_s);
  record.set_tick(trip.tick);
  record.set_unit(safety::unit(trip.cause));
  record.set_reaction(safety::name(trip.reaction));
  return record;
}

// What the estimate saw, in place of the "internal_stop" that it asked the gate for.
void Runner::tell_fall(const BodyEstimate<>& body, v1::TripRecord& record) const {
  const episode::FallRule rule = episode::fall_rule_of(robot_.robot());
  const double tilt = episode::tilt_rad(body.roll_rad, body.pitch_rad);
  const bool tilted = !(tilt <= rule.tilt_rad);
  record.set_cause(tilted ? "fall_tilt" : "fall_height");
  record.set_value(tilted ? tilt : body.position.z);
  record.set_limit(tilted ? rule.tilt_rad : rule.least_height_m);
  record.set_unit(tilted ? "rad" : "m");
}

v1::Episode Runner::episode_of(const Order& order, const MotionResult& result,
                               std::int64_t started_ns) const {
  v1::Episode episode;
  episode.set_session(number_);
  episode.set_walk(order.walk);
  episode.set_part(part_of(order.part));
  episode.set_batch(order.batch);
  episode.set_index(order.index);
  episode.set_draw(order.draw);
  episode.set_outcome(outcome_of(result.outcome));
  v1::ReturnTerms& terms = *episode.mutable_terms();
  terms.set_forward(result.terms.forward);
  terms.set_energy(result.terms.energy);
  terms.set_drift(result.terms.drift);
  terms.set_turn(result.terms.turn);
  terms.set_fall(result.terms.fall);
  terms.set_total(result.terms.total());
  *episode.mutable_summary() = result.summary;
  *episode.mutable_trace() = result.trace;
  if (result.tripped) *episode.mutable_trip() = record_of(result.trip);
  if (result.fall_estimated) tell_fall(result.fall_body, *episode.mutable_trip());
  episode.set_parameters_sha256(journal::parameters_sha256(order.parameters));
  episode.set_started_s(static_cast<double>(started_ns) * 1e-9);
  return episode;
}

std::int64_t Runner::session_ns() { return clock_base_ns_ + (mover_.report().now.value - clock_origin_ns_); }

void Runner::say(const std::string& words) {
  (void)journal_.note(number_, words).ok;
  hooks_.on_note(words);
}

// What the status says after a restart, until another session begins.
void Runner::recall_last_session() {
  const std::optional<journal::SessionRow> row = journal_.last_session();
  if (!row) return;
  last_.Clear();
  last_.set_session(row->session);
  last_.set_session_part(row->ended ? v1::ENDED : v1::INTERRUPTED);
  files::Defects ignored;  // an unreadable plan is told when the session is resumed
  const std::optional<v1::Plan> plan = files::parse_plan(row->plan_text, "recorded plan", ignored);
  if (plan) last_.set_walks_planned(walks_planned(*plan));
  double baseline = 0;
  int baseline_walks = 0;
  std::optional<double> best;
  for (const journal::Journal::Finished& walk : journal_.finished(row->session)) {
    const v1::Episode& episode = walk.episode;
    last_.set_walks_done(episode.walk());
    if (episode.outcome() == v1::FELL) last_.set_falls(last_.falls() + 1);
    if (episode.outcome() == v1::VOID) last_.set_voids(last_.voids() + 1);
    if (episode.outcome() == v1::VOID) continue;
    const double total = episode.terms().total();
    if (episode.part() == v1::BASELINE) baseline += total, ++baseline_walks;
    if (episode.part() == v1::SEARCH) best = std::max(best.value_or(total), total);
  }
  if (baseline_walks > 0) last_.set_start_return(baseline / baseline_walks);
  if (best) last_.set_best_return(*best);
  const std::optional<v1::Verdict> verdict = journal_.verdict(row->session);
  if (verdict) *last_.mutable_verdict() = *verdict;
}

void Runner::tell_joints(const CycleReport& report, v1::Status& status) const {
  status.clear_joints();
  for (int j = 0; j < report.joint_count; ++j) {
    v1::JointStatus& joint = *status.add_joints();
    joint.set_name(robot_.robot().joints(j).name());
    joint.set_angle_rad(report.angle[j]);
    if (report.targeted) joint.set_target_rad(report.target[j]);
    joint.set_winding_c(report.winding[j]);
  }
}

void Runner::fill(v1::Status& status) {
  const CycleReport report = mover_.report();
  if (!session_) {
    status.MergeFrom(last_);
  } else {
    // It has ended when its verdict is on disk, not before.
    status.set_session_part(session_->next() ? session_->part() : v1::IN_CONFIRMATION);
    status.set_session(number_);
    status.set_walks_done(session_->walks_done());
    status.set_walks_planned(session_->walks_planned());
    status.set_falls(session_->falls());
    status.set_voids(session_->voids());
    status.set_best_return(session_->best_return());
    status.set_start_return(session_->start_return());
  }
  const bool stopped = report.phase != safety::Phase::armed;
  status.set_robot_state(stopped ? v1::TRIPPED : state_ == v1::TRIPPED ? v1::PARKED : state_);
  // A trip within a session may be one that the session gets up from; it says so when it waits for a person.
  status.set_waiting_for(waiting_for_.empty() && stopped && !session_ ? "release" : waiting_for_);
  status.clear_trip();
  if (stopped) *status.mutable_trip() = record_of(report.trip);
  status.set_robot(robot_.robot().name());
  status.set_robot_sha256_hex(robot_sha_);
  status.set_pace(mover_.pace() == Pace::wall ? "wall" : "stepped");
  status.set_scheduling(mover_.scheduling());
  status.set_simulated(mover_.simulated());
  status.set_pack_voltage_v(report.pack_voltage_v);
  status.set_pack_current_a(report.pack_current_a);
  status.set_winding_max_c(report.winding_max_c);
  tell_joints(report, status);
  status.set_ticks(report.ticks);
  status.set_overruns(report.overruns);
  status.set_software(software());
}

}  // namespace pastern::session
