// What the adaptation changed in a policy, with names that an engineer knows.
#pragma once

#include <string>
#include <vector>

#include "pastern/v1/policy.pb.h"
#include "runtime/types/parameters.h"

namespace pastern::tools {

struct GroupChange {
  std::string name;
  std::size_t count{0};
  double start_norm{0};
  double change_norm{0};  ///< Euclidean norm of the difference
  /// change_norm / start_norm, the trust region's measure; 0 for a group that is all zero.
  [[nodiscard]] double relative() const { return start_norm > 0 ? change_norm / start_norm : 0; }
};

struct ParameterChange {
  std::string name;  ///< "front_left leg angle <- pitch rate"
  double from{0};
  double to{0};
};

/// Both of the policy's size. Groups in the policy's order; a policy without groups is one group, "all".
[[nodiscard]] std::vector<GroupChange> group_changes(const v1::Policy& policy, const Parameters& from,
                                                     const Parameters& to);
/// The `most` largest differences, largest first; unchanged ones are left out.
[[nodiscard]] std::vector<ParameterChange> largest_changes(const v1::Policy& policy, const Parameters& from,
                                                           const Parameters& to, std::size_t most);
/// What parameter `index` is: output, then input; "unit 3" and the like inside the network.
[[nodiscard]] std::string parameter_name(const v1::Policy& policy, std::size_t index);

}  // namespace pastern::tools
