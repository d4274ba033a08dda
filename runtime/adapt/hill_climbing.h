// Hill climbing, sequential, averaged and in batches: take the best perturbation if it walked better than the
// incumbent. Batch form: "Rapidly Adaptable Legged Robots via Evolutionary Meta-Learning", arXiv:2003.01239.
//
//   sequential  one candidate a batch        x <- x + sigma g                   if f~(x + sigma g) > f~(x)
//   averaged    one candidate, r walks       the same with means of r walks
//   batch       p candidates                 x <- argmax_i f~(x + sigma g_i)    if that exceeds f~(x)
//
// f~(x) is the mean of the incumbent's last r walks (r = 1 but for averaged). With `remeasure` (the default)
// the incumbent walks once more in every batch and its oldest walk is forgotten. That costs one walk a batch
// and buys that a lucky walk, or one from before the robot drifted, is forgotten: with a value remembered for
// ever the climber freezes (the winner of p noisy walks is too good by the largest of p noises). The
// published form
// (`remeasure` off) measures the start once and remembers.
//
// Only comparisons of returns decide (averaged: of means): any order-preserving change of the return leaves
// the sequential and batch forms' course the same to the bit.
#pragma once

#include <deque>
#include <optional>
#include <vector>

#include "runtime/adapt/operator.h"
#include "runtime/adapt/region.h"

namespace pastern::adapt {

class HillClimbing final : public Operator {
 public:
  HillClimbing(const Settings& settings, const Parameters& start);

  [[nodiscard]] const std::vector<Proposal>& batch() const override { return batch_; }
  bool observe(const Committed<Evaluation>& evaluation) override;
  [[nodiscard]] const Parameters& incumbent() const override { return incumbent_; }
  [[nodiscard]] std::string name() const override;

 private:
  void propose();
  void judge();
  [[nodiscard]] std::vector<double> returns_of(std::size_t first) const;

  Kind kind_;
  Region region_;
  std::size_t candidates_;
  std::size_t repeats_;
  bool remeasure_;
  std::uint32_t number_{0};  // of the batch
  Parameters incumbent_;
  std::deque<double> incumbent_walks_;  // its latest returns, at most repeats_
  std::size_t incumbent_asked_{0};      // walks of the incumbent at the head of this batch
  std::vector<Proposal> batch_;
  std::vector<std::optional<double>> told_;
};

}  // namespace pastern::adapt
