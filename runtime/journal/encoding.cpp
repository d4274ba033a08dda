// The encoding behind digests, seals and stored parameters.
#include "runtime/journal/encoding.h"

#include <bit>

#include "proto/files/sha256.h"
#include "runtime/journal/journal.h"

namespace pastern::journal {

Encoding& Encoding::number(std::uint64_t value) {
  for (unsigned shift = 0; shift < 64; shift += 8) bytes_ += static_cast<char>((value >> shift) & 0xFFU);
  return *this;
}

Encoding& Encoding::real(double value) { return number(std::bit_cast<std::uint64_t>(value)); }

Encoding& Encoding::text(std::string_view value) {
  number(value.size());
  bytes_ += value;
  return *this;
}

std::string bytes_of(const Parameters& parameters) {
  Encoding encoding;
  for (const double value : parameters) encoding.real(value);
  return encoding.bytes();
}

std::optional<Parameters> parameters_of(std::string_view bytes) {
  if (bytes.size() % 8 != 0) return std::nullopt;
  Parameters parameters;
  for (std::size_t at = 0; at < bytes.size(); at += 8) {
    std::uint64_t bits = 0;
    for (unsigned i = 0; i < 8; ++i)
      bits |= static_cast<std::uint64_t>(static_cast<unsigned char>(bytes[at + i])) << (8 * i);
    parameters.push_back(std::bit_cast<double>(bits));
  }
  return parameters;
}

std::string sum_hex(std::string_view bytes) { return files::hex(files::sha256(bytes)); }

std::string seal_of(const std::vector<std::string>& texts) {
  Encoding encoding;
  for (const std::string& value : texts) encoding.text(value);
  return sum_hex(encoding.bytes());
}

std::string parameters_sha256(const Parameters& parameters) {
  return files::raw(files::sha256(bytes_of(parameters)));
}

}  // namespace pastern::journal
