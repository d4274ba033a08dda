// A plan file that has been read and checked.
#pragma once

#include <cstdint>
#include <optional>
#include <string>

#include "pastern/v1/plan.pb.h"
#include "proto/files/defect.h"

namespace pastern::files {

/// Walks of the first batch of the plan's adaptation operator, with the defaults of runtime/adapt/operator.h
/// for what the plan does not say (a test holds the two together): hill climbing walks the incumbent too. 0
/// for OFFERED_CANDIDATE. A search of fewer walks would search nothing.
[[nodiscard]] std::uint32_t first_batch_walks(const v1::Plan& plan);

[[nodiscard]] std::optional<v1::Plan> parse_plan(const std::string& text, const std::string& file,
                                                 Defects& defects);
[[nodiscard]] std::optional<v1::Plan> read_plan(const std::string& path, Defects& defects);

}  // namespace pastern::files
