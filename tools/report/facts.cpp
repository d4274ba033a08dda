// See facts.h.
#include "tools/report/facts.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "proto/files/artefact.h"
#include "proto/files/plan_file.h"
#include "proto/files/sha256.h"

namespace pastern::tools {
namespace {

std::optional<v1::Policy> policy_in(const journal::Journal& journal, const std::string& sha256_hex) {
  const auto bytes = journal.policy(sha256_hex);
  v1::Policy policy;
  files::Defects defects;
  if (!bytes || !files::unpack_artefact(*bytes, files::kPolicyKind, sha256_hex, policy, defects))
    return std::nullopt;
  return policy;
}

Parameters parameters_of(const v1::Policy& policy) {
  return {policy.parameters().begin(), policy.parameters().end()};
}

/// The file that the verdict names; without one the parameters that walked last as adapted.
void find_adapted(const journal::Journal& journal, Facts& facts) {
  if (facts.verdict && !facts.verdict->adapted_sha256().empty()) {
    facts.adapted_sha256_hex = files::hex(facts.verdict->adapted_sha256());
    if (const auto policy = policy_in(journal, facts.adapted_sha256_hex)) {
      facts.adapted_parameters = parameters_of(*policy);
      return;
    }
  }
  for (auto walk = facts.walks.rbegin(); walk != facts.walks.rend(); ++walk) {
    if (walk->part() != v1::CONFIRMATION_ADAPTED) continue;
    if (const auto parameters = journal.parameters(walk->parameters_sha256()))
      facts.adapted_parameters = *parameters;
    return;
  }
}

std::optional<journal::SessionRow> row_of(const journal::Journal& journal, std::uint64_t session,
                                          std::string& why) {
  std::vector<journal::SessionRow> rows = journal.sessions();
  rows.erase(std::remove_if(rows.begin(), rows.end(), [](const auto& row) { return row.session == 0; }),
             rows.end());
  if (rows.empty()) {
    why = "found no session in the journal, expected one";
    return std::nullopt;
  }
  if (session == 0) return rows.back();
  for (const journal::SessionRow& row : rows) {
    if (row.session == session) return row;
  }
  why = fmt::format("found no session {}, expected one of 1 to {}", session, rows.back().session);
  return std::nullopt;
}

void add(v1::ReturnTerms& sum, const v1::ReturnTerms& terms, double factor) {
  sum.set_forward(sum.forward() + factor * terms.forward());
  sum.set_energy(sum.energy() + factor * terms.energy());
  sum.set_drift(sum.drift() + factor * terms.drift());
  sum.set_turn(sum.turn() + factor * terms.turn());
  sum.set_fall(sum.fall() + factor * terms.fall());
  sum.set_total(sum.total() + factor * terms.total());
}

double spread_of(const std::vector<const v1::Episode*>& walks, double mean) {
  if (walks.size() < 2) return 0;
  double squares = 0;
  for (const v1::Episode* walk : walks) squares += std::pow(walk->terms().total() - mean, 2);
  return std::sqrt(squares / static_cast<double>(walks.size() - 1));
}

}  // namespace

Means means_of(const std::vector<const v1::Episode*>& walks) {
  Means means;
  means.walks = walks.size();
  std::size_t forward = 0;
  const double share = walks.empty() ? 0 : 1.0 / static_cast<double>(walks.size());
  for (const v1::Episode* walk : walks) {
    const v1::EpisodeSummary& summary = walk->summary();
    means.falls += walk->outcome() == v1::FELL ? 1 : 0;
    means.left_lane += walk->outcome() == v1::LEFT_LANE ? 1 : 0;
    add(means.terms, walk->terms(), share);
    means.speed_m_per_s += share * summary.mean_speed_m_per_s();
    means.distance_m += share * summary.distance_m();
    means.roll_rms_rad += share * summary.roll_rms_rad();
    means.pitch_rms_rad += share * summary.pitch_rms_rad();
    means.roll_max_rad += share * summary.roll_max_rad();
    means.pitch_max_rad += share * summary.pitch_max_rad();
    const int points = walk->trace().y_m_size();
    if (points > 0) means.aside_m += share * std::abs(static_cast<double>(walk->trace().y_m(points - 1)));
    if (!summary.moved_forward()) continue;
    means.cost_of_transport += summary.cost_of_transport();
    ++forward;
  }
  if (forward > 0) means.cost_of_transport /= static_cast<double>(forward);
  means.spread = spread_of(walks, means.terms.total());
  return means;
}

std::vector<const v1::Episode*> Facts::counted(v1::Part part) const {
  std::vector<const v1::Episode*> found;
  for (const v1::Episode& walk : walks) {
    if (walk.part() == part && walk.outcome() != v1::VOID) found.push_back(&walk);
  }
  return found;
}

std::vector<const v1::Episode*> Facts::before() const {
  auto walked = counted(v1::CONFIRMATION_START);
  return walked.empty() ? counted(v1::BASELINE) : walked;
}

std::vector<const v1::Episode*> Facts::after() const { return counted(v1::CONFIRMATION_ADAPTED); }

std::vector<Pair> Facts::pairs() const {
  std::map<std::uint32_t, std::pair<const v1::Episode*, const v1::Episode*>>
      halves;  // by batch: the pair's number
  for (const v1::Episode* walk : counted(v1::CONFIRMATION_START)) halves[walk->batch()].first = walk;
  for (const v1::Episode* walk : counted(v1::CONFIRMATION_ADAPTED)) halves[walk->batch()].second = walk;
  std::vector<Pair> pairs;
  for (const auto& [batch, both] : halves) {
    if (both.first == nullptr || both.second == nullptr) continue;
    pairs.push_back({static_cast<std::uint32_t>(pairs.size() + 1), both.first->terms().total(),
                     both.second->terms().total(), both.second->walk() < both.first->walk()});
  }
  return pairs;
}

std::size_t Facts::count(v1::Outcome outcome) const {
  return static_cast<std::size_t>(
      std::count_if(walks.begin(), walks.end(), [&](const auto& walk) { return walk.outcome() == outcome; }));
}

std::optional<Facts> gather(const journal::Journal& journal, std::uint64_t session, std::string& why) {
  const auto row = row_of(journal, session, why);
  if (!row) return std::nullopt;
  Facts facts;
  facts.row = *row;
  files::Defects ignored;  // a plan of another version is shown as it is
  facts.plan = files::parse_plan(row->plan_text, "plan", ignored);
  facts.verdict = journal.verdict(row->session);
  for (const auto& finished : journal.finished(row->session)) facts.walks.push_back(finished.episode);
  facts.begun = journal.get(journal::begun_key(row->session)).value_or("");
  facts.simulated = facts.begun.substr(0, facts.begun.find(", by ")).find("simulated") != std::string::npos;
  const std::string drives = journal.get(journal::drives_key(row->session)).value_or("");
  facts.drives = drives.substr(0, drives.find('\n'));
  if (facts.drives.size() < drives.size()) facts.drives_settings = drives.substr(facts.drives.size() + 1);
  facts.digest = journal.digest(row->session);
  facts.notes = journal.notes(row->session);
  facts.adoptions = journal.adoptions();
  facts.start = policy_in(journal, row->start_policy_sha256_hex);
  if (facts.start) facts.start_parameters = parameters_of(*facts.start);
  find_adapted(journal, facts);
  if (!journal.failure().empty()) {
    why = journal.failure();
    return std::nullopt;
  }
  return facts;
}

}  // namespace pastern::tools
