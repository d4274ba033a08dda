// The trust region and the perturbations inside it, shared by the operators of this folder.
#pragma once

#include <cstdint>
#include <vector>

#include "runtime/adapt/operator.h"

namespace pastern::adapt {

/// Start, groups and the size of the trust region of one session, checked once.
class Region {
 public:
  /// Throws std::invalid_argument: start empty or not finite; a group that reaches beyond it, overlaps
  /// another or has no positive scale; no group; trust region not positive.
  Region(const Settings& settings, Parameters start);

  [[nodiscard]] const Parameters& start() const { return start_; }

  /// `point` with each group's change from the start shrunk to the group's radius, direction kept. A value
  /// that is not finite falls back to the start's whole group.
  [[nodiscard]] Parameters shrunk(Parameters point) const;

  /// point + factor * scale(group) * g, shrunk. g ~ N(0, I) is a pure function of (seed, batch, index) and of
  /// the parameter's place.
  [[nodiscard]] Parameters perturbed(const Parameters& point, double factor, std::uint32_t batch,
                                     std::uint32_t index) const;

 private:
  Parameters start_;
  std::vector<Group> groups_;
  std::uint64_t seed_;
  double trust_region_;
};

}  // namespace pastern::adapt
