// Puts a session's facts into words, tables and pictures.
#pragma once

#include "tools/report/document.h"
#include "tools/report/facts.h"

namespace pastern::tools {

[[nodiscard]] Document report_of(const Facts& facts);

}  // namespace pastern::tools
