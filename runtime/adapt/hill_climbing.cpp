// Hill climbing: a batch is the incumbent's walks first, then each candidate's.
#include "runtime/adapt/hill_climbing.h"

#include <algorithm>
#include <stdexcept>

#include "runtime/adapt/told.h"

namespace pastern::adapt {
namespace {

std::size_t at_least_one(std::uint32_t value, const char* what) {
  if (value == 0)
    throw std::invalid_argument(std::string("adaptation: ") + what + " is 0, expected at least 1");
  return value;
}

template <class Walks>
double mean(const Walks& walks) {
  double sum = 0;
  for (const double walk : walks) sum += walk;
  return sum / static_cast<double>(walks.size());
}

}  // namespace

HillClimbing::HillClimbing(const Settings& settings, const Parameters& start)
    : kind_(settings.kind),
      region_(settings, start),
      candidates_(settings.kind == Kind::batch ? at_least_one(settings.batch, "batch") : 1),
      repeats_(settings.kind == Kind::averaged ? at_least_one(settings.repeats, "repeats") : 1),
      remeasure_(settings.remeasure),
      incumbent_(start) {
  propose();
}

void HillClimbing::propose() {
  incumbent_asked_ = repeats_ - std::min(repeats_, incumbent_walks_.size());
  if (incumbent_asked_ == 0 && remeasure_) incumbent_asked_ = 1;
  batch_.clear();
  const auto ask = [&](const Parameters& parameters) {
    batch_.push_back({number_, static_cast<std::uint32_t>(batch_.size()), parameters});
  };
  for (std::size_t i = 0; i < incumbent_asked_; ++i) ask(incumbent_);
  for (std::size_t candidate = 0; candidate < candidates_; ++candidate) {
    const Parameters parameters =
        region_.perturbed(incumbent_, 1.0, number_, static_cast<std::uint32_t>(candidate));
    for (std::size_t i = 0; i < repeats_; ++i) ask(parameters);
  }
  told_.assign(batch_.size(), std::nullopt);
}

bool HillClimbing::observe(const Committed<Evaluation>& evaluation) {
  if (!accept(evaluation.value(), number_, told_)) return false;
  if (!complete(told_)) return false;
  judge();
  ++number_;
  propose();
  return true;
}

void HillClimbing::judge() {
  for (std::size_t i = 0; i < incumbent_asked_; ++i) {
    incumbent_walks_.push_back(*told_[i]);
    if (incumbent_walks_.size() > repeats_) incumbent_walks_.pop_front();
  }
  double best = mean(incumbent_walks_);
  std::optional<std::size_t> winner;  // place of its first walk in the batch
  for (std::size_t first = incumbent_asked_; first < batch_.size(); first += repeats_) {
    const double value = mean(returns_of(first));
    if (!(value > best)) continue;
    best = value;
    winner = first;
  }
  if (!winner) return;
  incumbent_ = batch_[*winner].parameters;
  const std::vector<double> walks = returns_of(*winner);
  incumbent_walks_.assign(walks.begin(), walks.end());
}

std::vector<double> HillClimbing::returns_of(std::size_t first) const {
  std::vector<double> returns;
  for (std::size_t i = 0; i < repeats_; ++i) returns.push_back(*told_[first + i]);
  return returns;
}

std::string HillClimbing::name() const {
  switch (kind_) {
    case Kind::sequential:
      return "sequential hill climbing";
    case Kind::averaged:
      return "averaged hill climbing";
    default:
      return "batch hill climbing (arXiv:2003.01239)";
  }
}

}  // namespace pastern::adapt
