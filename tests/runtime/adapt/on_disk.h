// Stands in for the journal in tests of the adaptation: the only other place that can make Committed values.
// Not to be linked together with the real journal.
#pragma once

#include <cmath>
#include <functional>

#include "runtime/adapt/operator.h"

namespace pastern::journal {

class Journal {
 public:
  static Committed<Evaluation> commit(const Evaluation& evaluation) {
    return Committed<Evaluation>(evaluation);
  }
};

}  // namespace pastern::journal

namespace pastern::adapt {

inline Committed<Evaluation> walked(std::uint32_t batch, std::uint32_t index, double total,
                                    Outcome outcome = Outcome::completed) {
  Evaluation evaluation{batch, index, outcome, {}};
  evaluation.terms.forward = total;
  return journal::Journal::commit(evaluation);
}

/// Return of a walk with these parameters; the number counts all walks from 0.
using Walk = std::function<double(const Proposal& proposal, std::uint32_t number)>;

/// Runs `batches` whole batches. Returns the number of walks.
inline std::uint32_t run(Operator& adaptation, std::uint32_t batches, const Walk& walk) {
  std::uint32_t number = 0;
  for (std::uint32_t i = 0; i < batches; ++i) {
    const std::vector<Proposal> batch = adaptation.batch();
    for (const Proposal& p : batch) (void)adaptation.observe(walked(p.batch, p.index, walk(p, number++)));
  }
  return number;
}

inline Settings settings_of(Kind kind, std::size_t size, double scale, std::uint64_t seed) {
  Settings settings;
  settings.kind = kind;
  settings.seed = seed;
  settings.trust_region = 1e6;
  settings.groups = {{"all", 0, size, scale}};
  return settings;
}

}  // namespace pastern::adapt
