// Locale-free, shortest round trip.
#include "proto/files/number.h"

#include <array>
#include <charconv>

namespace pastern::files {

std::string shown_number(double value) {
  std::array<char, 40> text{};
  const auto end = std::to_chars(text.data(), text.data() + text.size(), value);
  return {text.data(), end.ptr};
}

}  // namespace pastern::files
