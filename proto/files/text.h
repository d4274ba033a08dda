// Text-format protobuf files: read whole, parse strictly (unknown fields and duplicates are errors), check
// rules.
#pragma once

#include <google/protobuf/message.h>

#include <optional>
#include <string>
#include <string_view>

#include "proto/files/defect.h"

namespace pastern::files {

/// Reads at most 16 MiB; missing, unreadable, a folder, too large: a defect.
[[nodiscard]] std::optional<std::string> read_whole(const std::string& path, Defects& defects);

/// Parses `text` into `message` and checks its rules; false with defects otherwise.
[[nodiscard]] bool parse_text(std::string_view text, const std::string& file,
                              google::protobuf::Message& message, Defects& defects);

}  // namespace pastern::files
