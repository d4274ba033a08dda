// SHA-256 (FIPS 180-4) through libsodium, which libzmq loads in any case for CURVE.
#pragma once

#include <array>
#include <cstdint>
#include <string>
#include <string_view>

namespace pastern::files {

using Sha256 = std::array<std::uint8_t, 32>;

[[nodiscard]] Sha256 sha256(std::string_view bytes);
[[nodiscard]] std::string hex(const Sha256& digest);
[[nodiscard]] std::string hex(std::string_view bytes);
/// The 32 bytes as a string, for protobuf bytes fields.
[[nodiscard]] std::string raw(const Sha256& digest);

}  // namespace pastern::files
