// Bytes of a fuzzer as numbers; after the last byte everything is zero.
#pragma once

#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <cstdlib>
#include <cstring>
#include <limits>
#include <string>

namespace pastern::fuzz {

class Input {
 public:
  Input(const std::uint8_t* data, std::size_t size) : data_(data), left_(size) {}

  [[nodiscard]] bool empty() const { return left_ == 0; }
  [[nodiscard]] std::uint8_t byte() {
    if (left_ == 0) return 0;
    --left_;
    return *data_++;
  }
  /// Up to `most` bytes, as many as the next byte says.
  [[nodiscard]] std::string bytes(std::size_t most) {
    std::size_t count = byte();
    count = count * most / 255;
    if (count > left_) count = left_;
    std::string text(reinterpret_cast<const char*>(data_), count);
    data_ += count;
    left_ -= count;
    return text;
  }
  /// Mostly within a few times `size`, sometimes any bit pattern, sometimes what breaks arithmetic.
  [[nodiscard]] double number(double size) {
    const std::uint8_t kind = byte();
    if (kind < 200) return (static_cast<double>(kind) - 100) / 50 * size;
    constexpr double kUgly[] = {std::numeric_limits<double>::quiet_NaN(),
                                std::numeric_limits<double>::infinity(),
                                -std::numeric_limits<double>::infinity(),
                                std::numeric_limits<double>::max(),
                                std::numeric_limits<double>::lowest(),
                                std::numeric_limits<double>::denorm_min(),
                                -0.0,
                                1e300};
    if (kind < 208) return kUgly[kind - 200];
    std::uint64_t bits = 0;
    for (int i = 0; i < 8; ++i) bits = bits << 8U | byte();
    double value = 0;
    std::memcpy(&value, &bits, sizeof value);
    return value;
  }

 private:
  const std::uint8_t* data_;
  std::size_t left_;
};

/// Ends the process with a line that says what does not hold: a fuzzer's way to fail.
inline void expect(bool holds, const char* what) {
  if (holds) return;
  std::fprintf(stderr, "does not hold: %s\n", what);
  std::abort();
}

}  // namespace pastern::fuzz
