// Sessions and their walks: what a resumed session is rebuilt from.
#include <string>

#include "proto/files/sha256.h"
#include "runtime/journal/encoding.h"
#include "runtime/journal/impl.h"

namespace pastern::journal {
namespace {

const char* name_of(v1::Part part) {
  switch (part) {
    case v1::BASELINE:
      return "baseline";
    case v1::SEARCH:
      return "search";
    case v1::CONFIRMATION_START:
      return "confirmation start";
    case v1::CONFIRMATION_ADAPTED:
      return "confirmation adapted";
    case v1::SINGLE:
      return "single";
    default:
      return nullptr;
  }
}

const char* name_of(v1::Outcome outcome) {
  switch (outcome) {
    case v1::COMPLETED:
      return "completed";
    case v1::FELL:
      return "fell";
    case v1::LEFT_LANE:
      return "left the lane";
    case v1::VOID:
      return "void";
    default:
      return nullptr;
  }
}

Evaluation evaluation_of(const v1::Episode& episode) {
  Evaluation evaluation;
  evaluation.batch = episode.batch();
  evaluation.index = episode.index();
  evaluation.outcome = episode.outcome() == v1::COMPLETED   ? Outcome::completed
                       : episode.outcome() == v1::FELL      ? Outcome::fell
                       : episode.outcome() == v1::LEFT_LANE ? Outcome::left_lane
                                                            : Outcome::voided;
  const v1::ReturnTerms& terms = episode.terms();
  const std::string& cause = episode.trip().cause();
  evaluation.stopped_by_person =
      cause == "operator_stop" || cause == "operator_halt" || cause == "emergency_stop";
  evaluation.terms = {terms.forward(), terms.energy(), terms.drift(), terms.turn(), terms.fall()};
  return evaluation;
}

std::string walk_words(std::uint64_t session, std::uint64_t walk) {
  return "walk " + std::to_string(walk) + (session == 0 ? "" : " of session " + std::to_string(session));
}

std::int64_t last_walk_in(Database& database, std::uint64_t session) {
  Query query(database, "SELECT ifnull(max(walk), 0) FROM walks WHERE session = ?", session);
  return query.row() ? query.integer(0) : -1;
}

bool has_ended(Database& database, std::uint64_t session) {
  Query query(database, "SELECT ended FROM sessions WHERE session = ?", session);
  return query.row() && query.integer(0) != 0;
}

std::string objection_to(Database& database, const v1::Episode& episode) {
  if (name_of(episode.part()) == nullptr) return "its part is not said";
  if (name_of(episode.outcome()) == nullptr) return "its outcome is not said";
  if (has_ended(database, episode.session())) return "the session has ended";
  const std::int64_t last = last_walk_in(database, episode.session());
  if (static_cast<std::int64_t>(episode.walk()) == last + 1) return "";
  return "found walk " + std::to_string(episode.walk()) + ", expected walk " + std::to_string(last + 1);
}

std::string walk_seal(std::uint64_t session, std::uint64_t walk, const std::string& episode_bytes) {
  return seal_of({std::to_string(session), std::to_string(walk), episode_bytes});
}

std::string session_seal(const SessionRow& row, const std::string& verdict_bytes) {
  return seal_of({row.plan_text, row.robot_sha256_hex, row.start_policy_sha256_hex,
                  row.start_parameters_sha256_hex, row.candidate_sha256_hex, row.software,
                  row.ended ? "1" : "0", verdict_bytes});
}

bool insert_walk(Database& database, const v1::Episode& episode, const std::string& parameters_hex) {
  const std::string bytes = episode.SerializeAsString();
  const v1::ReturnTerms& terms = episode.terms();
  const v1::EpisodeSummary& summary = episode.summary();
  Query query(
      database,
      "INSERT INTO walks (session, walk, part, batch, place, draw, outcome, void_reason, return_total,"
      " return_forward, return_energy, return_drift, return_turn, return_fall, duration_s, distance_m,"
      " mean_speed_m_per_s, energy_j, cost_of_transport, roll_max_rad, pitch_max_rad, winding_max_c,"
      " pack_min_v, trip_cause, started_s, parameters_sha256, episode_message, seal)"
      " VALUES (?,?,?,?,?,?,?,?,?,?,?,?,?,?,?,?,?,?,iif(?,?,NULL),?,?,?,?,nullif(?,''),?,?,?,?)",
      episode.session(), episode.walk(), name_of(episode.part()), episode.batch(), episode.index(),
      episode.draw(), name_of(episode.outcome()), episode.void_reason(), terms.total(), terms.forward(),
      terms.energy(), terms.drift(), terms.turn(), terms.fall(), summary.duration_s(), summary.distance_m(),
      summary.mean_speed_m_per_s(), summary.energy_j(), std::uint32_t{summary.moved_forward()},
      summary.cost_of_transport(), summary.roll_max_rad(), summary.pitch_max_rad(), summary.winding_max_c(),
      summary.pack_min_v(), episode.trip().cause(), episode.started_s(), parameters_hex, Blob{bytes},
      walk_seal(episode.session(), episode.walk(), bytes));
  return query.done();
}

SessionRow session_of(const Query& query) {
  SessionRow row;
  row.session = static_cast<std::uint64_t>(query.integer(0));
  row.plan_text = query.bytes(1);
  row.robot_sha256_hex = query.bytes(2);
  row.start_policy_sha256_hex = query.bytes(3);
  row.start_parameters_sha256_hex = query.bytes(4);
  row.candidate_sha256_hex = query.bytes(5);
  row.software = query.bytes(6);
  row.ended = query.integer(7) != 0;
  return row;
}

}  // namespace

Written Journal::begin_session(SessionRow& row) {
  std::int64_t number = 0;
  SessionRow fresh = row;
  fresh.ended = false;
  Written written = impl_->write("new session", [&](std::string&) {
    Query insert(
        impl_->database,
        "INSERT INTO sessions (plan_text, robot_sha256, start_policy_sha256, start_parameters_sha256,"
        " candidate_sha256, software, seal) VALUES (?,?,?,?,?,?,?)",
        row.plan_text, row.robot_sha256_hex, row.start_policy_sha256_hex, row.start_parameters_sha256_hex,
        row.candidate_sha256_hex, row.software, session_seal(fresh, ""));
    const bool done = insert.done();
    number = sqlite3_last_insert_rowid(impl_->database.handle());
    return done;
  });
  if (written.ok) row.session = static_cast<std::uint64_t>(number);
  return written;
}

std::vector<SessionRow> Journal::sessions() const {
  std::vector<SessionRow> rows;
  Query query(impl_->database,
              "SELECT session, plan_text, robot_sha256, start_policy_sha256, start_parameters_sha256,"
              " candidate_sha256, software, ended FROM sessions WHERE session > 0 ORDER BY session");
  while (query.row()) rows.push_back(session_of(query));
  impl_->sound(query, "sessions");
  return rows;
}

std::optional<SessionRow> Journal::last_session() const {
  std::vector<SessionRow> rows = sessions();
  if (rows.empty()) return std::nullopt;
  return std::move(rows.back());
}

Written Journal::end_session(std::uint64_t session, const v1::Verdict& verdict) {
  return impl_->write("end of session " + std::to_string(session), [&](std::string& objection) {
    if (session == 0 || verdict.kind() == v1::Verdict::KIND_NOT_SAID)
      objection = session == 0 ? "session 0 has no end" : "the verdict is not said";
    else if (has_ended(impl_->database, session))
      objection = "it has ended already";
    if (!objection.empty()) return false;
    SessionRow row;
    for (SessionRow& candidate : sessions())
      if (candidate.session == session) row = std::move(candidate);
    if (row.session != session) objection = "there is no such session";
    if (!objection.empty()) return false;
    row.ended = true;
    const std::string bytes = verdict.SerializeAsString();
    Query update(
        impl_->database,
        "UPDATE sessions SET ended = 1, ended_utc = strftime('%Y-%m-%dT%H:%M:%SZ', 'now'), verdict = ?,"
        " p_value = ?, pairs = ?, effect = ?, effect_low = ?, effect_high = ?, interval_level = ?,"
        " words = ?, verdict_message = ?, seal = ? WHERE session = ?",
        verdict.kind() == v1::Verdict::ADOPT ? "adopt" : "keep", verdict.p_value(), verdict.pairs(),
        verdict.effect(), verdict.effect_low(), verdict.effect_high(), verdict.interval_level(),
        verdict.words(), Blob{bytes}, session_seal(row, bytes), session);
    return update.done();
  });
}

std::optional<v1::Verdict> Journal::verdict(std::uint64_t session) const {
  Query query(impl_->database, "SELECT verdict_message FROM sessions WHERE session = ? AND ended = 1",
              session);
  if (!query.row()) {
    impl_->sound(query, "verdict");
    return std::nullopt;
  }
  v1::Verdict verdict;
  if (verdict.ParseFromString(query.bytes(0))) return verdict;
  impl_->fail("verdict of session " + std::to_string(session), "damaged: not a verdict");
  return std::nullopt;
}

std::optional<Committed<Evaluation>> Journal::commit(const v1::Episode& episode, const Parameters& parameters,
                                                     const std::string& robot_state, std::string& why) {
  v1::Episode finished = episode;
  const Evaluation evaluation = evaluation_of(episode);
  const std::string bytes = bytes_of(parameters);
  const std::string sum = sum_hex(bytes);
  finished.mutable_terms()->set_total(evaluation.terms.total());
  finished.set_parameters_sha256(parameters_sha256(parameters));
  Database& database = impl_->database;
  const Written written =
      impl_->write(walk_words(episode.session(), episode.walk()), [&](std::string& objection) {
        objection = objection_to(database, finished);
        if (!objection.empty()) return false;
        return Query(database, "INSERT OR IGNORE INTO parameters (sha256, count, bytes) VALUES (?, ?, ?)",
                     sum, std::uint64_t{parameters.size()}, Blob{bytes})
                   .done() &&
               insert_walk(database, finished, sum) &&
               (robot_state.empty() ||
                Query(database,
                      "INSERT OR REPLACE INTO carried_state (one, session, walk, bytes, seal) VALUES (1, ?, "
                      "?, ?, ?)",
                      finished.session(), finished.walk(), Blob{robot_state}, seal_of({robot_state}))
                    .done());
      });
  if (!written.ok) {
    why = written.words;
    return std::nullopt;
  }
  return Committed<Evaluation>(evaluation);
}

std::vector<Journal::Finished> Journal::finished(std::uint64_t session) const {
  std::vector<Finished> walks;
  Query query(impl_->database,
              "SELECT episode_message, seal, walk FROM walks WHERE session = ? ORDER BY walk", session);
  while (query.row()) {
    const std::string bytes = query.bytes(0);
    v1::Episode episode;
    if (walk_seal(session, static_cast<std::uint64_t>(query.integer(2)), bytes) != query.bytes(1) ||
        !episode.ParseFromString(bytes)) {
      impl_->fail(walk_words(session, static_cast<std::uint64_t>(query.integer(2))),
                  "damaged: does not match its seal");
      return {};
    }
    const Evaluation evaluation = evaluation_of(episode);
    walks.push_back(Finished{std::move(episode), Committed<Evaluation>(evaluation)});
  }
  if (!impl_->sound(query, "walks of session " + std::to_string(session))) return {};
  return walks;
}

std::uint64_t Journal::last_walk(std::uint64_t session) const {
  const std::int64_t last = last_walk_in(impl_->database, session);
  if (last < 0) impl_->fail("last walk", "not read: " + impl_->database.message());
  return last < 0 ? 0 : static_cast<std::uint64_t>(last);
}

Written Journal::mark_void(std::uint64_t session, std::uint64_t walk, const std::string& reason) {
  Database& database = impl_->database;
  return impl_->write("void mark on " + walk_words(session, walk), [&](std::string& objection) {
    v1::Episode episode;
    const std::int64_t last = last_walk_in(database, session);
    if (walk == 0 || static_cast<std::int64_t>(walk) != last)
      objection = "only the last finished walk can be void, which is " + std::to_string(last);
    else if (has_ended(database, session))
      objection = "the session has ended";
    if (!objection.empty()) return false;
    {
      Query query(database, "SELECT episode_message FROM walks WHERE session = ? AND walk = ?", session,
                  walk);
      if (!query.row() || !episode.ParseFromString(query.bytes(0))) return false;
    }
    if (episode.outcome() == v1::VOID) objection = "it is void already";
    if (!objection.empty()) return false;
    episode.set_outcome(v1::VOID);
    episode.set_void_reason(reason);
    const std::string bytes = episode.SerializeAsString();
    Query update(database,
                 "UPDATE walks SET outcome = 'void', void_reason = ?, episode_message = ?, seal = ?"
                 " WHERE session = ? AND walk = ?",
                 reason, Blob{bytes}, walk_seal(session, walk, bytes), session, walk);
    return update.done();
  });
}

std::optional<Parameters> Journal::parameters(const std::string& sha256) const {
  const std::string key = sha256.size() == 32 ? files::hex(std::string_view(sha256)) : sha256;
  Query query(impl_->database, "SELECT bytes FROM parameters WHERE sha256 = ?", key);
  if (!query.row()) {
    impl_->sound(query, "parameters " + key);
    return std::nullopt;
  }
  const std::string bytes = query.bytes(0);
  std::optional<Parameters> parameters = parameters_of(bytes);
  if (parameters && sum_hex(bytes) == key) return parameters;
  impl_->fail("parameters " + key, "damaged: do not match their sum");
  return std::nullopt;
}

std::string Journal::digest(std::uint64_t session) const {
  Encoding encoding;
  {
    Query query(
        impl_->database,
        "SELECT plan_text, robot_sha256, start_policy_sha256, start_parameters_sha256, candidate_sha256"
        " FROM sessions WHERE session = ?",
        session);
    if (!query.row()) return "";
    for (int column = 0; column < 5; ++column) encoding.text(query.bytes(column));
  }
  for (const Finished& walk : finished(session)) {
    const v1::Episode& e = walk.episode;
    const v1::ReturnTerms& t = e.terms();
    encoding.number(e.walk())
        .number(static_cast<std::uint64_t>(e.part()))
        .number(e.batch())
        .number(e.index());
    encoding.number(e.draw()).number(static_cast<std::uint64_t>(e.outcome()));
    encoding.real(t.forward()).real(t.energy()).real(t.drift()).real(t.turn()).real(t.fall()).real(t.total());
    encoding.text(e.parameters_sha256());
  }
  if (const std::optional<v1::Verdict> v = verdict(session)) {
    encoding.number(static_cast<std::uint64_t>(v->kind()))
        .real(v->p_value())
        .real(v->level())
        .number(v->pairs());
    encoding.real(v->effect()).real(v->effect_low()).real(v->effect_high()).real(v->interval_level());
    encoding.text(v->rule()).text(v->adapted_sha256());
  }
  return sum_hex(encoding.bytes());
}

}  // namespace pastern::journal
