// A plan file that has been read and checked.
#pragma once

#include <optional>
#include <string>

#include "pastern/v1/plan.pb.h"
#include "proto/files/defect.h"

namespace pastern::files {

[[nodiscard]] std::optional<v1::Plan> parse_plan(const std::string& text, const std::string& file,
                                                 Defects& defects);
[[nodiscard]] std::optional<v1::Plan> read_plan(const std::string& path, Defects& defects);

}  // namespace pastern::files
