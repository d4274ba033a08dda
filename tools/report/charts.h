// The report's pictures. Each returns inline SVG, or an empty string when there is nothing to draw.
#pragma once

#include <string>

#include "tools/report/facts.h"

namespace pastern::tools {

/// Return of every walk over the session, parts apart, falls and voids marked.
[[nodiscard]] std::string returns_chart(const Facts& facts);
/// Paired differences with their mean and interval.
[[nodiscard]] std::string pairs_chart(const Facts& facts);
/// Roll and pitch over time, start policy left, adapted right.
[[nodiscard]] std::string attitude_chart(const Facts& facts);
/// Path from above, start policy over adapted.
[[nodiscard]] std::string path_chart(const Facts& facts);
/// Terms of the return, start policy beside adapted.
[[nodiscard]] std::string terms_chart(const Facts& facts);
/// Hottest winding and lowest pack voltage of every walk.
[[nodiscard]] std::string heat_chart(const Facts& facts);

}  // namespace pastern::tools
