// Antithetic evolution-strategy gradient: p pairs x +- sigma g, one step along the estimated gradient.
// "ES-MAML: Simple Hessian-Free Meta Learning", arXiv:1910.01215 (its inner adaptation step).
//
//   d_i = f~(x + sigma g_i) - f~(x - sigma g_i),  i = 1..p
//   x  <- x + step * sigma * (1/p) sum_i (d_i / s) g_i,   sigma the group's perturbation scale
//
// s, the spread of the pair differences, is the root mean square of the d_i after each is clipped to
// three medians of |d|. Dividing by it takes the return's unit and the site's noise out of the step; clipping
// keeps one fall (a difference many times the others) from being the whole step. |step| is bounded by step *
// sigma * max |g_i|, whatever the returns. Both walks of a pair follow one another, so that heat, sag and
// drift enter both.
//
// Where a proposal was shrunk into the trust region, g_i is what was really walked: half the pair's
// difference.
//
// Incumbent: the present centre x. It never walked itself; it is the mean of what the pairs said, not a lucky
// walk, so it cannot freeze under drift, and the session's confirmation walks it before anybody adopts it.
//
// Defaults, measured on the simulated dunlin12 on cold_store, 50 search walks, mean gain of the confirmation:
// an early start policy, 8 seeds, steps 1, 2, 4 with 5 pairs: +.46, +.38, +.12; the shipped one, 6 seeds,
// step 1 with 5 and 3 pairs: +.73, +.60.
#pragma once

#include <vector>

#include "runtime/adapt/operator.h"
#include "runtime/adapt/region.h"
#include "runtime/adapt/told.h"

namespace pastern::adapt {

/// Pair differences over their spread, by the rule above; all zero when no pair differs. A pair in which one
/// walk was the worst there can be (minus infinity) counts as clipped; one in which both were says nothing.
[[nodiscard]] std::vector<double> normalised_differences(const std::vector<double>& differences);

/// Unbiased estimate of the gradient from antithetic pairs, not normalised:
/// (1/p) sum_i d_i g_i / (2 sigma) (Nesterov and Spokoiny, Found. Comput. Math. 17, 2017). `directions` are
/// the g_i.
[[nodiscard]] Parameters antithetic_gradient(const std::vector<double>& differences,
                                             const std::vector<Parameters>& directions, double sigma);

class EsGradient final : public Operator {
 public:
  EsGradient(const Settings& settings, const Parameters& start);

  [[nodiscard]] const std::vector<Proposal>& batch() const override { return batch_; }
  bool observe(const Committed<Evaluation>& evaluation) override;
  [[nodiscard]] const Parameters& incumbent() const override { return centre_; }
  [[nodiscard]] std::string name() const override;

 private:
  void propose();
  void move();

  Region region_;
  std::size_t pairs_;
  double step_;
  std::uint32_t number_{0};  // of the batch
  Parameters centre_;
  std::vector<Proposal> batch_;  // +, -, +, - ...
  Told told_;
};

}  // namespace pastern::adapt
