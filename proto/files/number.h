// Numbers as people read them in a defect: shortest text that reads back as the same number.
#pragma once

#include <string>

namespace pastern::files {

/// "0.1", "-3", "nan", "inf".
[[nodiscard]] std::string shown_number(double value);

}  // namespace pastern::files
