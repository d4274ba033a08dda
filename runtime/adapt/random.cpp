// Philox4x32-10 and the two distributions made of it.
#include "runtime/adapt/random.h"

#include <Random123/philox.h>

#include <cmath>
#include <numbers>

namespace pastern::adapt {
namespace {

r123::Philox4x32::ctr_type block(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b,
                                 std::uint32_t c) {
  const r123::Philox4x32::ctr_type counter{{a, b, c, static_cast<std::uint32_t>(stream)}};
  const r123::Philox4x32::key_type key{
      {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32U)}};
  return r123::Philox4x32{}(counter, key);
}

std::uint64_t join(std::uint32_t low, std::uint32_t high) {
  return (static_cast<std::uint64_t>(high) << 32U) | low;
}

// Centre of one of 2^52 equal cells (exact in a double), so that 0 and 1 cannot come out (log below).
double open_unit(std::uint64_t bits) { return (static_cast<double>(bits >> 12U) + 0.5) * 0x1p-52; }

}  // namespace

std::uint64_t random_bits(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b,
                          std::uint32_t c) {
  const auto words = block(seed, stream, a, b, c);
  return join(words[0], words[1]);
}

double random_uniform(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b, std::uint32_t c) {
  return open_unit(random_bits(seed, stream, a, b, c));
}

double random_normal(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b, std::uint32_t c) {
  const auto words = block(seed, stream, a, b, c);
  const double radius = std::sqrt(-2.0 * std::log(open_unit(join(words[0], words[1]))));
  return radius * std::cos(2.0 * std::numbers::pi * open_unit(join(words[2], words[3])));
}

}  // namespace pastern::adapt
