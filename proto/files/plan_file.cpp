// Reads a plan file and judges what no single field can show: a plan that could never end in an adoption, or
// never end at all.
#include "proto/files/plan_file.h"

#include <cmath>

#include "proto/files/text.h"
#include "proto/files/words.h"

namespace pastern::files {
namespace {

using v1::Adaptation;

void judge_adaptation(const v1::Plan& plan, const std::string& file, Defects& defects) {
  const Adaptation& adaptation = plan.adaptation();
  const auto refuse = [&](const std::string& field, const std::string& found, const std::string& expected) {
    defects.push_back({file, field, found, expected});
  };
  const std::string kind = Adaptation::Kind_Name(adaptation.kind());
  if (adaptation.has_repeats() && adaptation.kind() != Adaptation::AVERAGED_HILL_CLIMBING) {
    refuse("adaptation.repeats", "a number", "nothing: " + kind + " has no repeats");
  }
  if (adaptation.has_step() && adaptation.kind() != Adaptation::ES_GRADIENT) {
    refuse("adaptation.step", "a number", "nothing: " + kind + " has no step");
  }
  const bool searches = adaptation.kind() != Adaptation::OFFERED_CANDIDATE;
  if (searches != (plan.search_walks() > 0)) {
    refuse("search_walks", std::to_string(plan.search_walks()),
           searches ? "at least 1 for " + kind : "0: OFFERED_CANDIDATE does not search");
  }
  const bool pairs = adaptation.kind() == Adaptation::ES_GRADIENT;
  const std::uint32_t walks = adaptation.batch() * (pairs ? 2 : 1);
  if (searches && adaptation.has_batch() && walks > plan.search_walks()) {
    refuse("adaptation.batch", std::to_string(adaptation.batch()),
           "a batch that fits into search_walks, " + std::to_string(plan.search_walks()) +
               (pairs ? " (a pair is two walks)" : ""));
  }
}

}  // namespace

std::optional<v1::Plan> parse_plan(const std::string& text, const std::string& file, Defects& defects) {
  v1::Plan plan;
  if (!parse_text(text, file, plan, defects)) return std::nullopt;
  const std::size_t before = defects.size();
  judge_adaptation(plan, file, defects);
  // The exact sign-flip test over n pairs cannot go below p = 2^-n.
  const double least = std::ldexp(1.0, -static_cast<int>(plan.confirmation_pairs()));
  if (!(least <= plan.confirmation_level())) {
    defects.push_back({file, "confirmation_level", shown_number(plan.confirmation_level()),
                       "at least " + shown_number(least) + ", the least p that " +
                           std::to_string(plan.confirmation_pairs()) + " pairs can give"});
  }
  const double minutes = (plan.baseline_walks() + 2.0 * plan.confirmation_pairs()) * plan.walk_s() / 60;
  if (!(minutes <= plan.max_minutes())) {
    defects.push_back({file, "max_minutes", shown_number(plan.max_minutes()),
                       "time for baseline and confirmation alone, " + shown_number(minutes) + " (min)"});
  }
  if (defects.size() != before) return std::nullopt;
  return plan;
}

std::optional<v1::Plan> read_plan(const std::string& path, Defects& defects) {
  const std::optional<std::string> text = read_whole(path, defects);
  if (!text) return std::nullopt;
  return parse_plan(*text, path, defects);
}

}  // namespace pastern::files
