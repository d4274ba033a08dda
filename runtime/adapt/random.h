// Counter-based random numbers: Philox4x32-10 of Random123 (Salmon et al., SC 2011). A number is a pure
// function of its coordinates: no state, any order, any thread.
#pragma once

#include <cstdint>

namespace pastern::adapt {

/// Streams, so that the same coordinates never serve two purposes.
enum class Stream : std::uint32_t { perturbation = 1, confirmation_order = 2, walk_draw = 3, test = 100 };

/// Uniform 64 bits of (seed, stream, a, b, c). Counter words are (a, b, c, stream), the key is the seed, low
/// word first.
[[nodiscard]] std::uint64_t random_bits(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b,
                                        std::uint32_t c = 0);
/// Uniform in (0, 1), 52 bits, never an end point.
[[nodiscard]] double random_uniform(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b,
                                    std::uint32_t c = 0);
/// Standard normal (Box and Muller, Ann. Math. Stat. 29(2), 1958); |value| < 8.7.
[[nodiscard]] double random_normal(std::uint64_t seed, Stream stream, std::uint32_t a, std::uint32_t b,
                                   std::uint32_t c = 0);

}  // namespace pastern::adapt
