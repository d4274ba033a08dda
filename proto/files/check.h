// Judges a message by the rules written on its fields (proto/pastern/v1/rule.proto), every defect in one
// line.
#pragma once

#include <google/protobuf/message.h>

#include <string>

#include "proto/files/defect.h"

namespace pastern::files {

/// Presence, finiteness, range, lengths and counts of every field, through sub-messages and repeated fields.
/// `prefix` stands before the field's path. Appends to `defects`.
void check_rules(const google::protobuf::Message& message, const std::string& file, const std::string& prefix,
                 Defects& defects);

}  // namespace pastern::files
