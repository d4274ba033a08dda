// Budgets: the search ends when the next whole batch does not fit into its walks, at max_falls falls, or when
// the minutes left are needed for the confirmation. The confirmation ends early only as "keep" (max_falls
// falls within it, or the minutes are used up), which can only lower the rate of false adoptions.
#include "runtime/session/session.h"

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <utility>

#include "runtime/adapt/confirm.h"
#include "runtime/adapt/operator.h"
#include "runtime/adapt/random.h"

namespace pastern::session {
namespace {

// settings: 0.5 for operators without a model, 1.5 for retuned candidates.
constexpr double kTrustRegion = 0.5;
constexpr double kTrustRegionOffered = 1.5;

bool offered(const v1::Plan& plan) { return plan.adaptation().kind() == v1::Adaptation::OFFERED_CANDIDATE; }

double trust_region(const v1::Plan& plan) {
  if (plan.adaptation().has_trust_region()) return plan.adaptation().trust_region();
  return offered(plan) ? kTrustRegionOffered : kTrustRegion;
}

adapt::Kind kind_of(v1::Adaptation::Kind kind) {
  switch (kind) {
    case v1::Adaptation::SEQUENTIAL_HILL_CLIMBING:
      return adapt::Kind::sequential;
    case v1::Adaptation::AVERAGED_HILL_CLIMBING:
      return adapt::Kind::averaged;
    case v1::Adaptation::BATCH_HILL_CLIMBING:
      return adapt::Kind::batch;
    default:
      return adapt::Kind::es_gradient;
  }
}

adapt::Settings settings_of(const SessionStart& start) {
  const v1::Adaptation& asked = start.plan.adaptation();
  adapt::Settings settings;
  settings.kind = kind_of(asked.kind());
  settings.seed = start.plan.seed();
  if (asked.has_batch()) settings.batch = asked.batch();
  if (asked.has_repeats()) settings.repeats = asked.repeats();
  if (asked.has_step()) settings.step = asked.step();
  settings.trust_region = trust_region(start.plan);
  settings.groups = start.groups;
  if (asked.has_perturbation_scale()) {
    for (Group& group : settings.groups) group.perturbation_scale = asked.perturbation_scale();
  }
  return settings;
}

std::string text(const char* format, double a, double b = 0, double c = 0, double d = 0) {
  char line[256];
#pragma GCC diagnostic push
#pragma GCC diagnostic ignored "-Wformat-nonliteral"
  const int written = std::snprintf(line, sizeof line, format, a, b, c, d);
#pragma GCC diagnostic pop
  return written > 0 ? std::string(line) : std::string();
}

}  // namespace

std::uint64_t walks_planned(const v1::Plan& plan) {
  const std::uint64_t search = offered(plan) ? 0 : plan.search_walks();
  return plan.baseline_walks() + search + 2ULL * plan.confirmation_pairs();
}

std::string refusal(const SessionStart& start) {
  if (!offered(start.plan)) {
    return start.candidate
               ? "a candidate was offered, but the plan's adaptation kind is not OFFERED_CANDIDATE"
               : "";
  }
  if (!start.candidate)
    return "the plan's adaptation kind is OFFERED_CANDIDATE, but no candidate policy came";
  if (start.candidate->size() != start.start.size()) {
    return "candidate policy: found " + std::to_string(start.candidate->size()) + " parameters, expected " +
           std::to_string(start.start.size()) + " as in the start policy";
  }
  const auto outside =
      adapt::outside_trust_region(start.start, *start.candidate, start.groups, trust_region(start.plan));
  if (outside) return "candidate policy: group " + *outside + " is outside the trust region";
  return "";
}

Session::Session(SessionStart start) : given_(std::move(start)) {
  if (!offered(given_.plan)) operator_ = adapt::make_operator(settings_of(given_), given_.start);
  if (given_.plan.baseline_walks() > 0) {
    order(Part::baseline, 0, 0, given_.start);
  } else {
    begin_search();
  }
}

Session::~Session() = default;
Session::Session(Session&&) noexcept = default;
Session& Session::operator=(Session&&) noexcept = default;

const Parameters& Session::adapted() const {
  if (operator_) return operator_->incumbent();
  return given_.candidate ? *given_.candidate : given_.start;
}

std::uint64_t Session::walks_planned() const { return session::walks_planned(given_.plan); }

double Session::start_return() const { return baseline_done_ > 0 ? baseline_sum_ / baseline_done_ : 0.0; }

void Session::order(Part part, std::uint32_t batch, std::uint32_t index, const Parameters& parameters) {
  Order wanted;
  wanted.walk = walks_ + 1;
  wanted.part = part;
  wanted.batch = batch;
  wanted.index = index;
  wanted.duration_s = given_.plan.walk_s();
  // By walk number: a repeated walk, and each half of a pair, meets chances of its own, as on a real robot.
  wanted.draw = adapt::random_bits(given_.plan.seed(), adapt::Stream::walk_draw,
                                   static_cast<std::uint32_t>(wanted.walk), 0);
  wanted.parameters = parameters;
  next_ = std::move(wanted);
}

bool Session::take(const Committed<Evaluation>& evaluation, double robot_time_s) {
  const Evaluation& told = evaluation.value();
  if (!next_ || told.batch != next_->batch || told.index != next_->index) return false;
  ++walks_;
  time_s_ = robot_time_s;
  if (told.outcome == Outcome::voided) {
    take_void(told.stopped_by_person);
    return true;
  }
  repeats_ = 0;
  const bool fell = told.outcome == Outcome::fell;
  if (fell) ++falls_;
  const double total = told.terms.total();
  switch (next_->part) {
    case Part::baseline:
      take_baseline(total);
      break;
    case Part::search:
      take_search(evaluation, total);
      break;
    default:
      take_confirmation(total, fell);
      break;
  }
  return true;
}

// The limit is there for a cause that nobody has found. A person who stops a walk knows why, and had to
// release before the next.
void Session::take_void(bool by_person) {
  ++voids_;
  if (!by_person) ++repeats_;
  if (repeats_ > given_.plan.max_void_repeats()) {
    keep("the same walk was void " + std::to_string(repeats_) + " times (the plan allows " +
         std::to_string(given_.plan.max_void_repeats()) +
         " repeats); find the cause before the next session");
    return;
  }
  const Order again = *next_;
  order(again.part, again.batch, again.index, again.parameters);
}

void Session::take_baseline(double total) {
  baseline_sum_ += total;
  ++baseline_done_;
  if (falls_ >= given_.plan.max_falls()) {
    keep("the start policy fell " + std::to_string(falls_) +
         " times in the baseline, which is the plan's limit");
  } else if (baseline_done_ < given_.plan.baseline_walks()) {
    order(Part::baseline, 0, baseline_done_, given_.start);
  } else {
    begin_search();
  }
}

void Session::begin_search() {
  if (!operator_) {
    begin_confirmation();
    return;
  }
  part_ = v1::IN_SEARCH;
  order_search();
}

void Session::order_search() {
  const std::vector<Proposal>& batch = operator_->batch();
  if (batch_position_ == 0 && search_done_ + batch.size() > given_.plan.search_walks()) {
    end_search("");
  } else if (falls_ >= given_.plan.max_falls()) {
    end_search("the search ended early at " + std::to_string(falls_) + " falls");
  } else if (minutes_used(2ULL * given_.plan.confirmation_pairs())) {
    end_search("the search ended early to leave time for the confirmation");
  } else {
    const Proposal& wanted = batch[batch_position_];
    order(Part::search, wanted.batch, wanted.index, wanted.parameters);
  }
}

void Session::take_search(const Committed<Evaluation>& evaluation, double total) {
  best_return_ = search_done_ == 0 ? total : std::max(best_return_, total);
  ++search_done_;
  ++batch_position_;
  batch_sum_ += total;
  if (operator_->observe(evaluation)) {
    last_batch_mean_ = batch_sum_ / static_cast<double>(batch_position_);
    batch_sum_ = 0;
    batch_position_ = 0;
  }
  order_search();
}

void Session::end_search(const std::string& why) {
  search_ended_ = why;
  if (search_done_ == 0 && why.empty()) {
    keep("nothing was searched: a batch of " + std::to_string(operator_->batch().size()) +
         " walks does not fit into the plan's " + std::to_string(given_.plan.search_walks()));
  } else if (adapted() == given_.start) {
    keep(why.empty() ? "the search found nothing better than the start policy"
                     : why + " and had found nothing better than the start policy");
  } else if (!why.empty() && falls_ >= given_.plan.max_falls() && !improved()) {
    keep(why + " and had shown no improvement");
  } else {
    begin_confirmation();
  }
}

// Only asked when falls ended the search: is it worth further walks? Hill climbing moves only when it saw
// better; the gradient always moves, so its last whole batch must have earned more than the start policy.
bool Session::improved() const {
  if (given_.plan.adaptation().kind() != v1::Adaptation::ES_GRADIENT || baseline_done_ == 0) return true;
  return last_batch_mean_ && *last_batch_mean_ > start_return();
}

bool Session::minutes_used(std::uint64_t walks_to_come) const {
  const double a_walk_s = walks_ > 0 ? time_s_ / static_cast<double>(walks_) : 0.0;
  return !(time_s_ + a_walk_s * static_cast<double>(walks_to_come) < 60.0 * given_.plan.max_minutes());
}

void Session::begin_confirmation() {
  part_ = v1::IN_CONFIRMATION;
  pair_ = 0;
  second_walk_ = false;
  order_confirmation();
}

void Session::order_confirmation() {
  const bool adapted_first = adapt::adapted_walks_first(given_.plan.seed(), pair_);
  const bool adapted_now = adapted_first != second_walk_;
  order(adapted_now ? Part::confirmation_adapted : Part::confirmation_start, pair_, second_walk_ ? 1 : 0,
        adapted_now ? adapted() : given_.start);
}

void Session::take_confirmation(double total, bool fell) {
  if (fell) ++confirmation_falls_;
  if (second_walk_) {
    const bool adapted_now = next_->part == Part::confirmation_adapted;
    differences_.push_back(adapted_now ? total - first_of_pair_ : first_of_pair_ - total);
    ++pair_;
  } else {
    first_of_pair_ = total;
  }
  second_walk_ = !second_walk_;
  if (pair_ == given_.plan.confirmation_pairs()) {
    judge();
  } else if (confirmation_falls_ >= given_.plan.max_falls()) {
    keep("the confirmation was left after " + std::to_string(confirmation_falls_) + " falls within it");
  } else if (minutes_used(0)) {
    keep("the confirmation was left because the plan's minutes were used up");
  } else {
    order_confirmation();
  }
}

void Session::judge() {
  const double level = given_.plan.confirmation_level();
  // Two-sided at 1 - 2*level: its lower end is above zero exactly where the one-sided test is passed.
  const double interval_level = 1.0 - 2.0 * level;
  const adapt::Interval interval = adapt::sign_flip_interval(differences_, interval_level);
  double sum = 0;
  for (const double difference : differences_) sum += difference;
  const double effect = sum / static_cast<double>(differences_.size());
  const double p = adapt::sign_flip_p(differences_);
  const bool adopt = p <= level && effect > 0;

  v1::Verdict verdict;
  verdict.set_kind(adopt ? v1::Verdict::ADOPT : v1::Verdict::KEEP);
  verdict.set_p_value(p);
  verdict.set_level(level);
  verdict.set_pairs(static_cast<std::uint32_t>(differences_.size()));
  verdict.set_effect(effect);
  verdict.set_effect_low(interval.low);
  verdict.set_effect_high(interval.high);
  verdict.set_interval_level(interval_level);
  verdict.set_rule("confirmation: exact one-sided sign-flip test");
  std::string words = adopt ? "adopt: " : "keep the start policy: ";
  words += text("the adapted policy earned %.2f a walk", std::abs(effect)) +
           (effect < 0 ? " less" : " more") + " than the start policy";
  words += text(" (%.0f %% interval %+.2f to %+.2f)", 100.0 * interval_level, interval.low, interval.high);
  words += text(", p = %.4f at level %g, ", p, level) + std::to_string(differences_.size()) + " pairs";
  // The interval's upper end is below zero exactly where the test the other way round is passed.
  const bool worse = interval.high < 0;
  if (of_no_practical_size(effect, interval.low, interval.high))
    words += text(": real, but of no practical size (below %g)", kPracticalSize);
  if (!adopt) words += worse ? ": the adapted policy walks worse" : ": not told apart from chance";
  if (!search_ended_.empty()) words += "; " + search_ended_;
  verdict.set_words(words);
  verdict_ = verdict;
  next_.reset();
  part_ = v1::ENDED;
}

void Session::keep(const std::string& words) {
  v1::Verdict verdict;
  verdict.set_kind(v1::Verdict::KEEP);
  verdict.set_p_value(1);
  verdict.set_level(given_.plan.confirmation_level());
  verdict.set_rule("no confirmation");
  verdict.set_words("keep the start policy: " + words);
  verdict_ = verdict;
  next_.reset();
  part_ = v1::ENDED;
}

v1::Verdict Session::ended_by_operator() const {
  v1::Verdict verdict;
  verdict.set_kind(v1::Verdict::KEEP);
  verdict.set_p_value(1);
  verdict.set_level(given_.plan.confirmation_level());
  verdict.set_rule("no confirmation");
  verdict.set_words("keep the start policy: an operator ended the session after " + std::to_string(walks_) +
                    " walks, before its verdict");
  return verdict;
}

}  // namespace pastern::session
