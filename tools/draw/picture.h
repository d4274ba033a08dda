// A scene as one self-contained SVG file: the walk moving, from the side and from above, and a strip of
// stills for paper. Left legs are drawn full, right legs broken; forces as bars under the feet. No colour
// carries meaning.
#pragma once

#include <string>

#include "tools/draw/scene.h"

namespace pastern::tools {

[[nodiscard]] std::string picture_of(const Scene& scene);

}  // namespace pastern::tools
