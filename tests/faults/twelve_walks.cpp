// The session, its check, and one trial.
#include "tests/faults/twelve_walks.h"

#include <cmath>

#include "proto/files/sha256.h"
#include "tests/faults/power_cut_vfs.h"

namespace pastern::faults {
namespace {

constexpr std::uint64_t kWalks = 12;
constexpr std::uint64_t kVoid = 7;
const std::string kPolicyBytes(5000, 'p');

std::string policy_sum() { return files::hex(files::sha256(kPolicyBytes)); }

Parameters parameters_of(std::uint64_t walk) {
  Parameters parameters;
  for (int i = 0; i < 228; ++i) parameters.push_back(std::sin(static_cast<double>(walk / 3) + 0.1 * i));
  return parameters;
}

v1::Episode episode_of(std::uint64_t session, std::uint64_t walk) {
  v1::Episode episode;
  episode.set_session(session);
  episode.set_walk(walk);
  episode.set_part(walk <= 3 ? v1::BASELINE : v1::SEARCH);
  episode.set_batch(static_cast<std::uint32_t>(walk / 4));
  episode.set_index(static_cast<std::uint32_t>(walk % 4));
  episode.set_draw(walk * 0x9E3779B97F4A7C15U);
  episode.set_outcome(walk == 5 ? v1::FELL : v1::COMPLETED);
  episode.mutable_terms()->set_forward(3 + std::sin(static_cast<double>(walk)));
  episode.mutable_terms()->set_fall(walk == 5 ? -1 : 0);
  for (int i = 0; i < 250; ++i) {
    episode.mutable_trace()->add_time_s(0.02F * static_cast<float>(i));
    episode.mutable_trace()->add_roll_rad(0.01F * static_cast<float>(i % 25));
    episode.mutable_trace()->add_x_m(0.016F * static_cast<float>(i));
  }
  return episode;
}

std::string state_of(std::uint64_t walk) { return std::string(300, static_cast<char>('a' + walk)); }

bool begin(journal::Journal& journal, Acknowledged& done) {
  if (const auto row = journal.last_session()) {
    done.session = row->session;
    return true;
  }
  journal::SessionRow row;
  row.plan_text = "name: \"twelve walks\"";
  row.robot_sha256_hex = std::string(64, 'a');
  row.start_policy_sha256_hex = policy_sum();
  if (!journal.store_policy(kPolicyBytes, policy_sum()).ok) return false;
  done.policy = true;
  if (!journal.confirm_first_start({row.robot_sha256_hex, "an operator", "2026-01-01T08:00:00Z"}).ok)
    return false;
  done.first_start = true;
  if (!journal.begin_session(row).ok) return false;
  done.session = row.session;
  return true;
}

// Everything that happens around one walk.
bool walk_once(journal::Journal& journal, Acknowledged& done, std::uint64_t walk) {
  const std::string command = "go " + std::to_string(walk);
  if (!journal.command("", command)) {
    if (!journal.remember_command({"", command, "", "accepted"}).ok) return false;
    done.commands.push_back(command);
  }
  std::string why;
  if (!journal.commit(episode_of(done.session, walk), parameters_of(walk), state_of(walk), why)) return false;
  done.walks.push_back(journal.finished(done.session).back().episode.SerializeAsString());
  done.robot_state_of = walk;
  if (!journal.put("windings", state_of(walk)).ok) return false;
  done.value_of = walk;
  v1::Telemetry telemetry;
  telemetry.set_sequence(journal.last_sequence() + 1);
  *telemetry.mutable_episode() = episode_of(done.session, walk);
  if (!journal.store_telemetry(telemetry).ok) return false;
  done.telemetry = telemetry.sequence();
  return journal.note(done.session, "walk " + std::to_string(walk)).ok;
}

bool end(journal::Journal& journal, Acknowledged& done) {
  if (!journal.last_session()->ended) {
    v1::Verdict verdict;
    verdict.set_kind(v1::Verdict::ADOPT);
    verdict.set_p_value(0.01171875);
    if (!journal.end_session(done.session, verdict).ok) return false;
  }
  done.ended = true;
  if (journal.adoptions().empty()) {
    if (!journal.adopt({policy_sum(), "an operator", "2026-01-01T09:00:00Z", "confirmed"}).ok) return false;
  }
  done.adopted = true;
  return true;
}

}  // namespace

bool continue_session(journal::Journal& journal, Acknowledged& done) {
  if (!begin(journal, done)) return false;
  for (std::uint64_t walk = journal.last_walk(done.session) + 1; walk <= kWalks; ++walk) {
    // The void mark belongs between its walk and the next; a cut may have taken it.
    const auto walks = journal.finished(done.session);
    if (walk == kVoid + 1 && walks.back().episode.outcome() != v1::VOID) {
      if (!journal.mark_void(done.session, kVoid, "bumped").ok) return false;
      done.walks.back() = journal.finished(done.session).back().episode.SerializeAsString();
      done.voided = kVoid;
    }
    if (!walk_once(journal, done, walk)) return false;
  }
  return end(journal, done);
}

std::string missing(const journal::Journal& journal, const Acknowledged& done) {
  const auto sessions = journal.sessions();
  if (done.session != 0 && sessions.empty()) return "the session";
  const auto walks =
      done.session != 0 ? journal.finished(done.session) : std::vector<journal::Journal::Finished>{};
  if (walks.size() < done.walks.size()) return "walk " + std::to_string(walks.size() + 1);
  for (std::size_t i = 0; i < done.walks.size(); ++i) {
    // A void mark that was under way may be there although nobody acknowledged it.
    const bool mark_under_way = i + 1 == kVoid && walks[i].episode.outcome() == v1::VOID && done.voided == 0;
    if (walks[i].episode.SerializeAsString() != done.walks[i] && !mark_under_way)
      return "content of walk " + std::to_string(i + 1);
    if (journal.parameters(walks[i].episode.parameters_sha256()) != parameters_of(i + 1)) return "parameters";
  }
  const auto at_least = [](const std::optional<std::string>& found, std::uint64_t walk) {
    return walk == 0 || (found && (*found == state_of(walk) || *found == state_of(walk + 1)));
  };
  if (!at_least(journal.robot_state(), done.robot_state_of)) return "carried state";
  if (!at_least(journal.get("windings"), done.value_of)) return "kept value";
  for (const std::string& command : done.commands)
    if (const auto row = journal.command("", command); !row || row->answer != "accepted") return "command";
  if (journal.telemetry(1, done.telemetry).size() != done.telemetry) return "telemetry";
  if (done.policy && journal.policy(policy_sum()) != kPolicyBytes) return "policy";
  if (done.first_start && !journal.first_start(std::string(64, 'a'))) return "first start";
  if (done.ended && !journal.verdict(done.session)) return "verdict";
  if (done.adopted && journal.adoptions().size() != 1) return "adoption";
  return journal.failure();
}

PowerCutTrial::PowerCutTrial(std::string folder) : folder_(std::move(folder)) {
  PowerCutDisk disk;
  std::string error;
  Acknowledged done;
  {
    const auto journal = journal::Journal::open(folder_, error, disk.vfs());
    if (!journal || !continue_session(*journal, done)) return;
    digest_ = journal->digest(done.session);
  }
  syncs_ = disk.syncs();
}

CutResult PowerCutTrial::cut(std::uint64_t n, unsigned tear, std::uint64_t seed) {
  CutResult result;
  PowerCutDisk disk;
  disk.cut_at_sync(n);
  std::string error;
  Acknowledged done;
  {
    const auto journal = journal::Journal::open(folder_, error, disk.vfs());
    if (journal) (void)continue_session(*journal, done);
  }  // closing may sync as well
  result.cut = disk.dead();
  if (!result.cut) return result;
  disk.power_on(static_cast<Tear>(tear % 3), seed);
  const auto journal = journal::Journal::open(folder_, error, disk.vfs());
  result.unreadable = journal == nullptr;
  if (!journal) {
    result.lost = error;
    return result;
  }
  result.lost = missing(*journal, done);
  result.other_result = !continue_session(*journal, done) || journal->digest(done.session) != digest_;
  return result;
}

}  // namespace pastern::faults
