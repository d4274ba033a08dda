// Numbers as people read them in a defect, and which texts may stand in one.
#pragma once

#include <string>
#include <string_view>

namespace pastern::files {

/// Shortest text that reads back as the same number: "0.1", "-3", "nan", "inf".
[[nodiscard]] std::string shown_number(double value);

/// Well-formed UTF-8 (RFC 3629, section 4) without control characters; line feeds only when `lines` says so.
[[nodiscard]] bool printable(std::string_view text, bool lines);

}  // namespace pastern::files
