// Damages files in every way a file gets damaged, and says for each damage whether it may be accepted.
// Used by the tests and by the bench of the promise.
#pragma once

#include <google/protobuf/descriptor.h>

#include <cstdint>
#include <functional>
#include <set>
#include <string>
#include <string_view>
#include <vector>

namespace pastern::damage {

/// A damaged text.
struct Damaged {
  std::string what;         ///< "joints[0].drive.peak_torque_nm = nan"
  std::string text;         ///< the whole file
  bool must_refuse{false};  ///< the damage breaks the field's rule, or is no text of the message at all
};

/// Every field of a printed file missing, twice, empty, NaN, infinite, negative, huge, tiny, of the wrong
/// kind. `text` is in TextFormat's own layout, one field a line. The judgement whether a value is out of
/// range is worked out here from the rule option, apart from the code under test. Field names met are added
/// to `covered`.
[[nodiscard]] std::vector<Damaged> damage_every_field(const std::string& text,
                                                      const google::protobuf::Descriptor& message,
                                                      std::set<std::string>& covered);

/// Full names of all fields that a message can hold, in all depths.
[[nodiscard]] std::set<std::string> all_fields(const google::protobuf::Descriptor& message);

struct BinaryTally {
  std::uint64_t tried{0};
  std::uint64_t accepted{0};
  std::uint64_t silent{0};  ///< refused without a defect that says why
};

/// Truncated at every byte, every length of tail appended up to 64 bytes, and `flips` random bit flips.
/// `accepts(bytes, said_why)` reads one damaged file.
[[nodiscard]] BinaryTally damage_binary(std::string_view bytes, std::uint64_t seed, int flips,
                                        const std::function<bool(const std::string&, bool&)>& accepts);

}  // namespace pastern::damage
