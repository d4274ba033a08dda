// Bytes that are hashed or stored: fixed widths, little-endian, lengths before texts. Private to this folder.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "runtime/types/parameters.h"

namespace pastern::journal {

/// Appends values in an encoding that no two different sequences share.
class Encoding {
 public:
  Encoding& number(std::uint64_t value);
  Encoding& real(double value);
  Encoding& text(std::string_view value);
  [[nodiscard]] const std::string& bytes() const { return bytes_; }

 private:
  std::string bytes_;
};

[[nodiscard]] std::string bytes_of(const Parameters& parameters);
/// Nothing when the size is no multiple of 8.
[[nodiscard]] std::optional<Parameters> parameters_of(std::string_view bytes);

/// Lower-case hex of SHA-256.
[[nodiscard]] std::string sum_hex(std::string_view bytes);

/// The seal of a row: SHA-256 of its texts, each with its length.
[[nodiscard]] std::string seal_of(const std::vector<std::string>& texts);

}  // namespace pastern::journal
