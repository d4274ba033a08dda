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
  const std::uint32_t least = first_batch_walks(plan);
  if (searches && plan.search_walks() > 0 && least > plan.search_walks()) {
    refuse("search_walks", std::to_string(plan.search_walks()),
           "at least " + std::to_string(least) + ", the first batch of " + kind);
  }
}

}  // namespace

std::uint32_t first_batch_walks(const v1::Plan& plan) {
  const Adaptation& adaptation = plan.adaptation();
  const std::uint32_t batch = adaptation.has_batch() ? adaptation.batch() : 5;
  const std::uint32_t repeats = adaptation.has_repeats() ? adaptation.repeats() : 3;
  switch (adaptation.kind()) {
    case Adaptation::SEQUENTIAL_HILL_CLIMBING:
      return 2;
    case Adaptation::AVERAGED_HILL_CLIMBING:
      return 2 * repeats;
    case Adaptation::BATCH_HILL_CLIMBING:
      return 1 + batch;
    case Adaptation::ES_GRADIENT:
      return 2 * batch;
    default:
      return 0;
  }
}

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
  const double least_walks =
      plan.baseline_walks() + first_batch_walks(plan) + 2.0 * plan.confirmation_pairs();
  const double minutes = least_walks * plan.walk_s() / 60;
  if (!(minutes <= plan.max_minutes())) {
    defects.push_back({file, "max_minutes", shown_number(plan.max_minutes()),
                       "at least " + shown_number(minutes) + ": " + shown_number(least_walks) + " walks of " +
                           shown_number(plan.walk_s()) + " s for baseline, first batch and confirmation"});
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
