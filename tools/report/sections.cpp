// See sections.h.
#include "tools/report/sections.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "proto/files/sha256.h"
#include "tools/pastern/follow.h"
#include "tools/pastern/words.h"
#include "tools/report/changes.h"
#include "tools/report/charts.h"

namespace pastern::tools {
namespace {

constexpr double kDegree = 3.14159265358979323846 / 180.0;

/// Two decimals; what rounds to nothing has no sign.
std::string two(double value) { return fmt::format("{:.2f}", std::abs(value) < 0.005 ? 0.0 : value); }
std::string signed_two(double value) { return fmt::format("{:+.2f}", std::abs(value) < 0.005 ? 0.0 : value); }
std::string degrees(double rad) { return fmt::format("{:.1f}", rad / kDegree); }
std::string dash_if(bool empty, const std::string& otherwise) { return empty ? "-" : otherwise; }

std::string robot_name(const Facts& facts) {
  if (facts.robot) return facts.robot->name();
  return facts.start ? facts.start->robot() : "robot";
}

/// The headline's end: says so when an effect is there but too small to matter.
std::string size_words(const v1::Verdict& verdict) {
  const bool tiny = verdict.pairs() > 0 &&
                    of_no_practical_size(verdict.effect(), verdict.effect_low(), verdict.effect_high());
  return tiny ? "; real, but of no practical size." : ".";
}

std::string headline(const Facts& facts) {
  if (!facts.verdict) return "No verdict: the session has not ended.";
  if (facts.verdict->kind() == v1::Verdict::ADOPT)
    return fmt::format("Adopt the adapted policy: it walks better on this {}robot, here{}",
                       facts.simulated ? "simulated " : "", size_words(*facts.verdict));
  if (facts.verdict->pairs() == 0) return "Keep the start policy: there was no confirmation.";
  if (facts.verdict->effect_high() < 0)
    return "Keep the start policy: the adapted one walks worse" + size_words(*facts.verdict);
  return "Keep the start policy: the adapted one is not shown to be better.";
}

/// What is current on the robot because of this session, and what to do.
std::string next_step(const Facts& facts) {
  if (!facts.verdict) return "Next: pastern resume goes on after the last finished walk.";
  for (const journal::Adoption& one : facts.adoptions) {
    if (one.policy_sha256_hex != facts.adapted_sha256_hex) continue;
    const bool still = facts.adoptions.back().policy_sha256_hex == one.policy_sha256_hex;
    return fmt::format("Adopted by {}, {}{}.", one.who, one.when_utc,
                       still ? "" : "; since then another policy was made current");
  }
  return facts.verdict->kind() == v1::Verdict::ADOPT
             ? "Not adopted yet. Next: pastern adopt makes it current; until then the robot walks as before."
             : "Nothing was adopted: the robot walks as before.";
}

/// Where the session ran; empty in a record that does not say.
std::string walked_on(const Facts& facts) {
  if (facts.begun.empty()) return "";
  return drives_words(facts.simulated, facts.drives, facts.drives_settings);
}

/// What the verdict rests on, in sentences.
std::vector<std::string> grounds(const Facts& facts) {
  std::vector<std::string> lines;
  if (const std::string on = walked_on(facts); !on.empty()) lines.push_back("Walked on: " + on + ".");
  if (facts.verdict && facts.verdict->pairs() > 0) {
    const v1::Verdict& v = *facts.verdict;
    lines.push_back(fmt::format(
        "Return of a walk, adapted less start policy: {:+.2f} ({:g} % interval {:+.2f} to {:+.2f}).",
        v.effect(), 100 * v.interval_level(), v.effect_low(), v.effect_high()));
    if (of_no_practical_size(v.effect(), v.effect_low(), v.effect_high())) {
      lines.push_back(
          fmt::format("Below {:g} return units an effect counts as of no practical size, however "
                      "sure it is.",
                      kPracticalSize));
    }
    lines.push_back(fmt::format("Rule: {}; p = {:.4f} from {} pairs, level {:g}.", v.rule(), v.p_value(),
                                v.pairs(), v.level()));
  }
  if (facts.verdict && facts.verdict->pairs() == 0 && !facts.verdict->words().empty()) {
    lines.push_back("The robot's words: " + facts.verdict->words() + ".");
  }
  const std::size_t counted = facts.walks.size() - facts.count(v1::VOID);
  lines.push_back(fmt::format("{} walks counted: {} fell, {} left the lane; {} void besides.", counted,
                              facts.count(v1::FELL), facts.count(v1::LEFT_LANE), facts.count(v1::VOID)));
  lines.push_back(next_step(facts));
  return lines;
}

void cautions(Document& document, const Facts& facts) {
  Block& block = document.cautions();
  if (facts.simulated) {
    block.rows.push_back(
        {"A simulated robot walked this session: a rehearsal, and no proof for a real one."});
  }
  const std::vector<std::vector<std::string>> always = {
      {"Pastern is not a certified safety function. Local rules, the maker's "
       "instructions and licensed practice come first."},
      {"The verdict holds for this robot, this site and this day: the load, floor, "
       "pack and wear under which it walked. "
       "When one of them changes, walk again before you rely on it."},
      {"After adopting, first walk with the lane clear and a hand on the emergency "
       "stop. The way back: pastern adopt --back."}};
  block.rows.insert(block.rows.end(), always.begin(), always.end());
}

void part_row(Block& table, const char* name, const Means& means) {
  if (means.walks == 0) return;
  table.rows.push_back({name, fmt::format("{}", means.walks), fmt::format("{}", means.falls),
                        fmt::format("{}", means.left_lane), two(means.terms.total()),
                        dash_if(means.walks < 2, two(means.spread)), two(means.speed_m_per_s)});
}

void returns_section(Document& document, const Facts& facts) {
  document.section("Returns of the session");
  document.figure("Return of every walk, in the order in which they were walked.", returns_chart(facts));
  Block& table =
      document.table("Means over the walks that count; spread is the standard deviation from walk to walk.",
                     {"part", "walks", "falls", "left lane", "return", "spread", "speed m/s"});
  part_row(table, "baseline, start policy", means_of(facts.counted(v1::BASELINE)));
  part_row(table, "search", means_of(facts.counted(v1::SEARCH)));
  part_row(table, "confirmation, start policy", means_of(facts.counted(v1::CONFIRMATION_START)));
  part_row(table, "confirmation, adapted policy", means_of(facts.counted(v1::CONFIRMATION_ADAPTED)));
  const auto baseline = facts.counted(v1::BASELINE);
  const auto again = facts.counted(v1::CONFIRMATION_START);
  if (!baseline.empty() && !again.empty()) {
    document.paragraph(fmt::format(
        "The start policy itself moved by {} between baseline and confirmation: that much is heat, pack, "
        "floor or "
        "chance. It cannot pass for progress, because both policies of a pair walked one after the other, in "
        "random order.",
        signed_two(means_of(again).terms.total() - means_of(baseline).terms.total())));
  }
}

void test_section(Document& document, const Facts& facts) {
  document.section("The test");
  const std::vector<Pair> pairs = facts.pairs();
  if (pairs.empty()) {
    document.paragraph("No pair was walked to its end, so nothing was tested.");
    return;
  }
  document.figure(
      "One row a pair: how much more the adapted policy earned than the start policy walked beside it.",
      pairs_chart(facts));
  Block& table = document.table("Pairs of the confirmation.",
                                {"pair", "start", "adapted", "difference", "walked first"});
  for (const Pair& pair : pairs) {
    table.rows.push_back({fmt::format("{}", pair.number), two(pair.start), two(pair.adapted),
                          signed_two(pair.adapted - pair.start), pair.adapted_first ? "adapted" : "start"});
  }
  if (!facts.verdict || facts.verdict->pairs() == 0) return;
  document.paragraph(
      fmt::format("Under the assumption that the adapted policy is no better, the signs of the {} "
                  "differences are as likely one way "
                  "as the other; a mean as large as {} or larger then comes up with probability {:.4f}. The "
                  "rule asks for at most {:g}.",
                  facts.verdict->pairs(), signed_two(facts.verdict->effect()), facts.verdict->p_value(),
                  facts.verdict->level()));
}

void walking_section(Document& document, const Facts& facts) {
  document.section("How it walks: before and after");
  document.figure(
      "Roll and pitch of the trunk over a walk. Thin: every walk; bold: the one whose return is in the "
      "middle.",
      attitude_chart(facts));
  document.figure("Path of the trunk by the robot's own odometry, unless the site has an external source.",
                  path_chart(facts));
  const Means before = means_of(facts.before());
  const Means after = means_of(facts.after());
  const bool none = after.walks == 0;
  Block& table = document.table("Means of a walk.", {"", "start policy", "adapted policy"});
  const auto row = [&](const char* name, const std::string& a, const std::string& b) {
    table.rows.push_back({name, dash_if(before.walks == 0, a), dash_if(none, b)});
  };
  row("walks", fmt::format("{}", before.walks), fmt::format("{}", after.walks));
  row("falls", fmt::format("{}", before.falls), fmt::format("{}", after.falls));
  row("left the lane", fmt::format("{}", before.left_lane), fmt::format("{}", after.left_lane));
  row("speed, m/s", two(before.speed_m_per_s), two(after.speed_m_per_s));
  row("distance along the lane, m", two(before.distance_m), two(after.distance_m));
  row("aside at the end, m", two(before.aside_m), two(after.aside_m));
  row("roll, rms, degrees", degrees(before.roll_rms_rad), degrees(after.roll_rms_rad));
  row("pitch, rms, degrees", degrees(before.pitch_rms_rad), degrees(after.pitch_rms_rad));
  row("greatest roll, degrees", degrees(before.roll_max_rad), degrees(after.roll_max_rad));
  row("greatest pitch, degrees", degrees(before.pitch_max_rad), degrees(after.pitch_max_rad));
  row("cost of transport, by the robot file's mass", two(before.cost_of_transport),
      two(after.cost_of_transport));
  document.paragraph(
      "Cost of transport: joint energy over weight and distance. The weight is that of the masses in the "
      "robot file; a load that the file does not know is not in it, and makes the figure look higher.");
}

void terms_section(Document& document, const Facts& facts) {
  document.section("What the return is made of");
  document.figure("Mean of a walk, each term on its own. What costs is negative; the return is the sum.",
                  terms_chart(facts));
  const v1::ReturnTerms a = means_of(facts.before()).terms;
  const v1::ReturnTerms b = means_of(facts.after()).terms;
  const bool none = facts.after().empty();
  Block& table = document.table("Mean of a walk, in return units.",
                                {"term", "start policy", "adapted policy", "difference"});
  const auto row = [&](const char* name, double from, double to) {
    table.rows.push_back({name, two(from), dash_if(none, two(to)), dash_if(none, signed_two(to - from))});
  };
  row("forward", a.forward(), b.forward());
  row("energy", a.energy(), b.energy());
  row("drift", a.drift(), b.drift());
  row("turn", a.turn(), b.turn());
  row("fall", a.fall(), b.fall());
  row("return", a.total(), b.total());
}

void heat_section(Document& document, const Facts& facts) {
  if (std::none_of(facts.walks.begin(), facts.walks.end(), walked)) return;
  document.section("Heat and pack over the session");
  document.figure("Hottest winding and lowest pack voltage within each walk.", heat_chart(facts));
  double hottest = -1e9;
  double lowest = 1e9;
  for (const v1::Episode& walk : facts.walks) {
    if (!walked(walk)) continue;
    hottest = std::max(hottest, walk.summary().winding_max_c());
    lowest = std::min(lowest, walk.summary().pack_min_v());
  }
  document.paragraph(fmt::format("Hottest winding of the session {:.0f} deg C, lowest pack voltage {:.1f} V.",
                                 hottest, lowest));
}

void changes_section(Document& document, const Facts& facts) {
  document.section("What changed in the policy");
  if (!facts.start || facts.adapted_parameters.size() != facts.start_parameters.size()) {
    document.paragraph("No adapted policy was put forward.");
    return;
  }
  Block& groups = document.table(
      "Per group of parameters; change is the norm of the difference over the norm of the start's.",
      {"group", "parameters", "norm of start", "norm of change", "change"});
  for (const GroupChange& one :
       group_changes(*facts.start, facts.start_parameters, facts.adapted_parameters)) {
    groups.rows.push_back({one.name, fmt::format("{}", one.count), fmt::format("{:.4f}", one.start_norm),
                           fmt::format("{:.4f}", one.change_norm),
                           fmt::format("{:.1f} %", 100 * one.relative())});
  }
  Block& largest = document.table("The largest single changes: output <- channel that it answers to.",
                                  {"parameter", "from", "to", "difference"});
  for (const ParameterChange& one :
       largest_changes(*facts.start, facts.start_parameters, facts.adapted_parameters, 10)) {
    largest.rows.push_back({one.name, fmt::format("{:.4f}", one.from), fmt::format("{:.4f}", one.to),
                            fmt::format("{:+.4f}", one.to - one.from)});
  }
}

void record_section(Document& document, const Facts& facts) {
  document.section("Record");
  Block& pairs = document.pairs();
  const auto fact = [&](const char* name, const std::string& value) {
    if (!value.empty()) pairs.rows.push_back({name, value});
  };
  fact("journal", facts.source);
  fact("session", fmt::format("{}{}", facts.row.session, facts.row.ended ? "" : " (not ended)"));
  if (facts.verdict) fact("verdict as written", facts.verdict->words());
  fact("software", facts.row.software);
  fact("report by", fmt::format("pastern {}", PASTERN_VERSION));
  fact("robot", robot_name(facts));
  fact("drives", walked_on(facts));
  fact("settings of the drives", facts.drives_settings);
  fact("robot file sha256", facts.row.robot_sha256_hex);
  fact("start policy sha256", facts.row.start_policy_sha256_hex);
  fact("adapted policy sha256", facts.adapted_sha256_hex);
  fact("candidate sha256", facts.row.candidate_sha256_hex);
  fact("digest of the session", facts.digest);
  if (facts.start) fact("start policy made by", facts.start->provenance().text());
  for (const journal::Adoption& one : facts.adoptions) {
    fact("adopted", fmt::format("{} by {}, {}: {}", brief_hash(one.policy_sha256_hex), one.who, one.when_utc,
                                one.words));
  }
  std::string plan = facts.row.plan_text;
  while (!plan.empty() && plan.back() == '\n') plan.pop_back();
  fact("plan", plan);
  if (facts.notes.empty()) return;
  document.paragraph("Notes of the robot during the session:");
  Block& notes = document.list();
  for (const std::string& note : facts.notes) notes.rows.push_back({note});
}

std::vector<std::string> figures_of(const v1::Episode& walk) {
  if (!walked(walk)) return std::vector<std::string>(11, "-");
  const v1::ReturnTerms& t = walk.terms();
  const v1::EpisodeSummary& s = walk.summary();
  return {two(t.total()),
          two(t.forward()),
          two(t.energy()),
          two(t.drift()),
          two(t.turn()),
          two(t.fall()),
          two(s.mean_speed_m_per_s()),
          degrees(s.roll_rms_rad()),
          degrees(s.pitch_rms_rad()),
          fmt::format("{:.0f}", std::round(s.winding_max_c()) + 0.0),
          fmt::format("{:.1f}", s.pack_min_v())};
}

void walks_section(Document& document, const Facts& facts) {
  document.section("Every walk");
  Block& table = document.table("", {"walk", "part", "outcome", "return", "forward", "energy", "drift",
                                     "turn", "fall", "m/s", "roll", "pitch", "C", "V", "policy", "remark"});
  table.long_table = true;
  for (const v1::Episode& walk : facts.walks) {
    std::vector<std::string> row = {fmt::format("{}", walk.walk()), words(walk.part()),
                                    words(walk.outcome())};
    for (std::string& figure : figures_of(walk)) row.push_back(std::move(figure));
    const std::string trip = trip_words(walk.trip());
    row.push_back(files::hex(walk.parameters_sha256()).substr(0, 8));
    row.push_back(walk.void_reason() + (walk.void_reason().empty() || trip.empty() ? "" : "; ") + trip);
    table.rows.push_back(std::move(row));
  }
  document.paragraph(
      "Roll and pitch: rms, degrees. C: hottest winding. V: lowest pack voltage. Policy: first digits of the "
      "sha256 of the parameters that walked.");
}

}  // namespace

Document report_of(const Facts& facts) {
  Document document;
  document.title = fmt::format("Session {} of {}{}{}", facts.row.session, robot_name(facts),
                               facts.begun.empty() ? "" : ", begun ", facts.begun);
  document.verdict = headline(facts);
  document.lines = grounds(facts);
  cautions(document, facts);
  returns_section(document, facts);
  walking_section(document, facts);
  terms_section(document, facts);
  test_section(document, facts);
  heat_section(document, facts);
  changes_section(document, facts);
  record_section(document, facts);
  walks_section(document, facts);
  return document;
}

}  // namespace pastern::tools
