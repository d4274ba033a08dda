// Kept values, policies, operators' acts, telemetry and notes.
#include <algorithm>

#include "runtime/journal/encoding.h"
#include "runtime/journal/impl.h"

namespace pastern::journal {

std::optional<std::string> Journal::Impl::one_value(Query& query, const std::string& what) {
  if (query.row()) return query.bytes(0);
  sound(query, what);
  return std::nullopt;
}

std::optional<std::string> Journal::robot_state() const {
  Query query(impl_->database, "SELECT bytes FROM carried_state WHERE one = 1");
  return impl_->one_value(query, "carried state");
}

Written Journal::put(const std::string& key, const std::string& value) {
  return impl_->write_one(key, "INSERT OR REPLACE INTO kept_values (name, bytes, seal) VALUES (?, ?, ?)", key,
                          Blob{value}, seal_of({key, value}));
}

std::optional<std::string> Journal::get(const std::string& key) const {
  Query query(impl_->database, "SELECT bytes FROM kept_values WHERE name = ?", key);
  return impl_->one_value(query, key);
}

Written Journal::store_policy(const std::string& bytes, const std::string& sha256_hex) {
  return impl_->write("policy " + sha256_hex, [&](std::string& objection) {
    const std::string sum = sum_hex(bytes);
    if (sum != sha256_hex) objection = "found bytes with the sum " + sum;
    return objection.empty() &&
           Query(impl_->database, "INSERT OR IGNORE INTO policies (sha256, bytes) VALUES (?, ?)", sum,
                 Blob{bytes})
               .done();
  });
}

std::optional<std::string> Journal::policy(const std::string& sha256_hex) const {
  Query query(impl_->database, "SELECT bytes FROM policies WHERE sha256 = ?", sha256_hex);
  std::optional<std::string> bytes = impl_->one_value(query, "policy " + sha256_hex);
  if (!bytes || sum_hex(*bytes) == sha256_hex) return bytes;
  impl_->fail("policy " + sha256_hex, "damaged: does not match its sum");
  return std::nullopt;
}

Written Journal::adopt(const Adoption& adoption) {
  return impl_->write("adoption of policy " + adoption.policy_sha256_hex, [&](std::string& objection) {
    {
      Query stored(impl_->database, "SELECT count(*) FROM policies WHERE sha256 = ?",
                   adoption.policy_sha256_hex);
      if (!stored.row()) return false;
      if (stored.integer(0) == 0) objection = "this policy is not in the journal";
    }
    return objection.empty() &&
           Query(impl_->database,
                 "INSERT INTO adoptions (policy_sha256, who, when_utc, words, seal) VALUES (?, ?, ?, ?, ?)",
                 adoption.policy_sha256_hex, adoption.who, adoption.when_utc, adoption.words,
                 seal_of({adoption.policy_sha256_hex, adoption.who, adoption.when_utc, adoption.words}))
               .done();
  });
}

std::vector<Adoption> Journal::adoptions() const {
  std::vector<Adoption> all;
  Query query(impl_->database, "SELECT policy_sha256, who, when_utc, words FROM adoptions ORDER BY adoption");
  while (query.row()) all.push_back({query.bytes(0), query.bytes(1), query.bytes(2), query.bytes(3)});
  impl_->sound(query, "adoptions");
  return all;
}

Written Journal::confirm_first_start(const FirstStart& first) {
  return impl_->write_one(
      "first start of robot file " + first.robot_sha256_hex,
      "INSERT OR IGNORE INTO first_starts (robot_sha256, who, when_utc, seal) VALUES (?, ?, ?, ?)",
      first.robot_sha256_hex, first.who, first.when_utc,
      seal_of({first.robot_sha256_hex, first.who, first.when_utc}));
}

std::optional<FirstStart> Journal::first_start(const std::string& robot_sha256_hex) const {
  Query query(impl_->database, "SELECT who, when_utc FROM first_starts WHERE robot_sha256 = ?",
              robot_sha256_hex);
  if (query.row()) return FirstStart{robot_sha256_hex, query.bytes(0), query.bytes(1)};
  impl_->sound(query, "first start");
  return std::nullopt;
}

Written Journal::remember_command(const CommandRow& command) {
  const auto& [key, id, sum, answer] = command;
  return impl_->write_one(
      "command " + id,
      "INSERT INTO commands (client_key, id, command_sha256, answer_message, seal) VALUES (?, ?, ?, ?, ?)",
      key, id, sum, Blob{answer}, seal_of({key, id, sum, answer}));
}

std::optional<CommandRow> Journal::command(const std::string& key, const std::string& id) const {
  Query query(impl_->database,
              "SELECT command_sha256, answer_message FROM commands WHERE client_key = ? AND id = ?", key, id);
  if (query.row()) return CommandRow{key, id, query.bytes(0), query.bytes(1)};
  impl_->sound(query, "command " + id);
  return std::nullopt;
}

Written Journal::store_telemetry(const v1::Telemetry& telemetry) {
  const std::string bytes = telemetry.SerializeAsString();
  return impl_->write_one("telemetry " + std::to_string(telemetry.sequence()),
                          "INSERT INTO telemetry (sequence, telemetry_message, seal) VALUES (?, ?, ?)",
                          telemetry.sequence(), Blob{bytes},
                          seal_of({std::to_string(telemetry.sequence()), bytes}));
}

std::vector<v1::Telemetry> Journal::telemetry(std::uint64_t from, std::uint64_t to) const {
  std::vector<v1::Telemetry> all;
  constexpr std::uint64_t kMost = 0x7FFFFFFFFFFFFFFF;  // sequences are stored signed
  if (from > kMost) return all;
  Query query(
      impl_->database,
      "SELECT telemetry_message, sequence FROM telemetry WHERE sequence BETWEEN ? AND ? ORDER BY sequence",
      from, std::min(to, kMost));
  while (query.row()) {
    v1::Telemetry message;
    if (!message.ParseFromString(query.bytes(0))) {
      impl_->fail("telemetry " + std::to_string(query.integer(1)), "damaged: not a message");
      return {};
    }
    all.push_back(std::move(message));
  }
  impl_->sound(query, "telemetry");
  return all;
}

std::uint64_t Journal::last_sequence() const {
  Query query(impl_->database, "SELECT ifnull(max(sequence), 0) FROM telemetry");
  if (query.row()) return static_cast<std::uint64_t>(query.integer(0));
  impl_->sound(query, "last sequence");
  return 0;
}

Written Journal::note(std::uint64_t session, const std::string& words) {
  return impl_->write_one("note", "INSERT INTO notes (session, words, seal) VALUES (?, ?, ?)", session, words,
                          seal_of({std::to_string(session), words}));
}

std::vector<std::string> Journal::notes(std::uint64_t session) const {
  std::vector<std::string> all;
  Query query(impl_->database, "SELECT words FROM notes WHERE session = ? ORDER BY note", session);
  while (query.row()) all.push_back(query.bytes(0));
  impl_->sound(query, "notes");
  return all;
}

}  // namespace pastern::journal
