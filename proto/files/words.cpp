// Locale-free, shortest round trip; UTF-8 judged by its table of well-formed sequences.
#include "proto/files/words.h"

#include <array>
#include <charconv>
#include <cstdint>

namespace pastern::files {
namespace {

std::uint8_t byte(std::string_view text, std::size_t at) { return static_cast<std::uint8_t>(text[at]); }

// Bytes of the well-formed sequence that begins at `at`; 0 when there is none. The second byte's range keeps
// out overlong forms, surrogates and what lies beyond U+10FFFF (RFC 3629, section 4).
std::size_t sequence(std::string_view text, std::size_t at) {
  const std::uint8_t first = byte(text, at);
  if (first < 0x80) return 1;
  if (first < 0xc2 || first > 0xf4) return 0;
  const std::size_t length = first < 0xe0 ? 2 : first < 0xf0 ? 3 : 4;
  if (at + length > text.size()) return 0;
  const std::uint8_t low = first == 0xe0 ? 0xa0 : first == 0xf0 ? 0x90 : 0x80;
  const std::uint8_t high = first == 0xed ? 0x9f : first == 0xf4 ? 0x8f : 0xbf;
  if (byte(text, at + 1) < low || byte(text, at + 1) > high) return 0;
  for (std::size_t i = 2; i < length; ++i) {
    if ((byte(text, at + i) & 0xc0U) != 0x80U) return 0;
  }
  return length;
}

}  // namespace

std::string shown_number(double value) {
  std::array<char, 40> text{};
  const auto end = std::to_chars(text.data(), text.data() + text.size(), value, std::chars_format::general);
  return {text.data(), end.ptr};
}

bool printable(std::string_view text, bool lines) {
  for (std::size_t at = 0; at < text.size();) {
    const std::size_t length = sequence(text, at);
    if (length == 0) return false;
    const std::uint8_t first = byte(text, at);
    const bool control = first < 0x20 || first == 0x7f || (first == 0xc2 && byte(text, at + 1) < 0xa0);
    if (control && !(lines && first == '\n')) return false;
    at += length;
  }
  return true;
}

}  // namespace pastern::files
