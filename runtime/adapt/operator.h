// An adaptation operator: returns in, next parameters out. Pure: no clock, no file; random numbers are a
// function of (seed, batch, index) by Philox4x32-10 (Random123). Replaying the same committed returns gives
// the same proposals.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "runtime/types/episode.h"
#include "runtime/types/parameters.h"

namespace pastern::adapt {

enum class Kind : std::uint8_t { sequential = 1, averaged = 2, batch = 3, es_gradient = 4 };

struct Settings {
  Kind kind{Kind::es_gradient};
  std::uint64_t seed{0};
  std::uint32_t batch{5};    ///< batch hill climbing: perturbations a batch; es_gradient: antithetic pairs
  std::uint32_t repeats{3};  ///< averaged hill climbing: walks a candidate
  double step{0};            ///< es_gradient: length of a step in perturbation scales; 0 = kDefaultStep
  bool remeasure{true};  ///< hill climbing: the incumbent walks once more in every batch (hill_climbing.h)
  double trust_region{0.5};   ///< per group: norm of the change relative to the start's group norm
  std::vector<Group> groups;  ///< with perturbation_scale of each
};

/// Default of Settings::step. Tuned on the simulated robot; see es_gradient.h.
inline constexpr double kDefaultStep = 1.0;

class Operator {
 public:
  virtual ~Operator() = default;
  /// The walks wanted next, a batch at once; the same again until all of them are observed.
  [[nodiscard]] virtual const std::vector<Proposal>& batch() const = 0;
  /// A result of the present batch, in any order, each once. Voided walks are never told: they are walked
  /// again. True when the batch is complete and the next one has been made. What is void, told before or not
  /// of this batch is ignored (false). A return that is not finite counts as the worst there can be.
  virtual bool observe(const Committed<Evaluation>& evaluation) = 0;
  /// The parameters the operator would name now (the start's before anything was learned).
  [[nodiscard]] virtual const Parameters& incumbent() const = 0;
  [[nodiscard]] virtual std::string name() const = 0;
};

/// `start` is inside its own trust region by definition; every proposal is inside, by shrinking the change
/// group by group. Parameters of no group stay as they are, and so does a group whose start is all zero.
/// Throws std::invalid_argument with one line when the settings or the start are unusable (files are checked
/// before they get here).
[[nodiscard]] std::unique_ptr<Operator> make_operator(const Settings& settings, const Parameters& start);

/// Group whose change is outside the trust region, or nothing. NaN is outside; so is another number of
/// parameters, or a change of a parameter that belongs to no group (then the answer says so in words).
[[nodiscard]] std::optional<std::string> outside_trust_region(const Parameters& start,
                                                              const Parameters& candidate,
                                                              const std::vector<Group>& groups,
                                                              double trust_region);

}  // namespace pastern::adapt
