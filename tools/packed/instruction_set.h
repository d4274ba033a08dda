// Which instructions walks by lanes run with: the widest that this machine has, or one that is asked for.
// Compiled for the plain machine.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

/// f(name) for each set that is compiled in; the names are also namespaces.
#if defined(__x86_64__) && !defined(PASTERN_LANES_PLAIN_ONLY)
#define PASTERN_LANES_EACH_SET(f) f(plain) f(avx2) f(avx512)
#elif defined(__aarch64__)
#define PASTERN_LANES_EACH_SET(f) f(neon)
#else
#define PASTERN_LANES_EACH_SET(f) f(plain)
#endif

namespace pastern::packed {

/// As compiled (tools/packed/lane_sets.cmake), narrowest first.
enum class InstructionSet : std::uint8_t { plain, neon, avx2, avx512 };

/// "plain", "neon", "avx2", "avx512": what a person types.
[[nodiscard]] std::string_view name_of(InstructionSet set);

/// For people, such as "AVX-512: 16 robots at once in float, 8 in double".
[[nodiscard]] std::string words_for(InstructionSet set);

/// Compiled in and had by this processor and its operating system, narrowest first; never empty.
[[nodiscard]] std::vector<InstructionSet> sets_here();

/// The widest of sets_here().
[[nodiscard]] InstructionSet widest_set();

/// The set of that name, or the widest for an empty name. None, with a line in `error` that names the choice,
/// when there is no such set or this machine does not have it.
[[nodiscard]] std::optional<InstructionSet> set_named(std::string_view name, std::string& error);

}  // namespace pastern::packed
