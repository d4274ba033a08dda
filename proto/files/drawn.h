// Numbers of a scenario by name, for those that are drawn from ranges.
#pragma once

#include <string>
#include <vector>

#include "pastern/v1/scenario.pb.h"

namespace pastern::files {

inline constexpr char kEachJoint[] = "each";
inline constexpr char kOneJoint[] = "one";

/// True for a number of a joint's wear.
[[nodiscard]] bool is_wear(const std::string& field);
/// True when `field` names a number: of the scenario, of a place in it ("load_at_m.y"), or of a joint's wear.
[[nodiscard]] bool is_number(const std::string& field);
/// True when the file gives it a value already. `joint` is looked at for wear only.
[[nodiscard]] bool is_fixed(const v1::Scenario& scenario, const std::string& field, const std::string& joint);
/// Sets the number, and makes the place (its other numbers 0) or the joint's wear that it belongs to. `field`
/// must be a number's.
void set_number(v1::Scenario& scenario, const std::string& field, const std::string& joint, double value);

}  // namespace pastern::files
