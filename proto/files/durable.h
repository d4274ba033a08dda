// Write temp, sync, rename, sync the folder, remove on failure: one function for every file we write whole.
#pragma once

#include <string>
#include <string_view>

#include "proto/files/defect.h"

namespace pastern::files {

/// After true the file holds exactly `bytes`, also after a power cut. After false the old file is untouched.
/// `mode` is the permission, e.g. 0644 or 0600.
[[nodiscard]] bool write_durably(const std::string& path, std::string_view bytes, unsigned mode,
                                 Defects& defects);

}  // namespace pastern::files
