// Binary files: a header, a protobuf message, a checksum.
//   bytes 0-7   magic "PASTERN" and 0x01 (version of this frame)
//   bytes 8-11  kind: "PLCY" policy, "PRIO" prior, "TRNR" resumable training
//   bytes 12-19 length of the payload, unsigned, little-endian
//   payload     the message, serialised deterministically
//   last 32     SHA-256 of everything before
// A reader refuses another magic, version, kind, length or checksum, and anything after the end.
#pragma once

#include <google/protobuf/message.h>

#include <string>
#include <string_view>

#include "proto/files/defect.h"
#include "proto/files/sha256.h"

namespace pastern::files {

inline constexpr std::string_view kPolicyKind = "PLCY";
inline constexpr std::string_view kPriorKind = "PRIO";
inline constexpr std::string_view kTrainingKind = "TRNR";

/// The whole file's bytes for a message.
[[nodiscard]] std::string pack_artefact(std::string_view kind, const google::protobuf::Message& message);

/// The inverse. `file` names the source in defects.
[[nodiscard]] bool unpack_artefact(std::string_view bytes, std::string_view kind, const std::string& file,
                                   google::protobuf::Message& message, Defects& defects);

}  // namespace pastern::files
