// Write temp, sync, rename, sync the folder, remove on failure: one function for every file we write whole.
#pragma once

#include <string>
#include <string_view>

#include "proto/files/defect.h"

namespace pastern::files {

/// After true the file holds exactly `bytes`, also after a power cut. After false the old file is untouched
/// and nothing is left beside it; only when the folder itself could not be synced (the line says so) the new
/// file stands, and a power cut may bring the old one back.
/// `mode` is the permission, e.g. 0644 or 0600.
[[nodiscard]] bool write_durably(const std::string& path, std::string_view bytes, unsigned mode,
                                 Defects& defects);

}  // namespace pastern::files
