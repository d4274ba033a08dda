// SHA-256 through libsodium; hexadecimal in small letters.
#include "proto/files/sha256.h"

#include <sodium/crypto_hash_sha256.h>

#include <algorithm>

namespace pastern::files {

Sha256 sha256(std::string_view bytes) {
  static_assert(crypto_hash_sha256_BYTES == std::tuple_size_v<Sha256>);
  Sha256 digest{};
  crypto_hash_sha256(digest.data(), reinterpret_cast<const unsigned char*>(bytes.data()), bytes.size());
  return digest;
}

std::string hex(std::string_view bytes) {
  static constexpr char kDigits[] = "0123456789abcdef";
  std::string text;
  text.reserve(2 * bytes.size());
  for (const char c : bytes) {
    const auto byte = static_cast<unsigned char>(c);
    text += kDigits[byte >> 4];
    text += kDigits[byte & 15];
  }
  return text;
}

std::string raw(const Sha256& digest) {
  std::string bytes(digest.size(), '\0');
  std::copy(digest.begin(), digest.end(), bytes.begin());
  return bytes;
}

std::string hex(const Sha256& digest) { return hex(std::string_view(raw(digest))); }

}  // namespace pastern::files
