// Policy parameters as a flat list in the policy file's order. Never used inside the cycle.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace pastern {

using Parameters = std::vector<double>;

/// A stretch of the parameters with a perturbation scale and a trust region of its own.
struct Group {
  std::string name;
  std::size_t first{0};
  std::size_t count{0};
  double perturbation_scale{0};
};

/// One walk that an adaptation operator asks for.
struct Proposal {
  std::uint32_t batch{0};
  std::uint32_t index{0};
  Parameters parameters;
};

}  // namespace pastern
