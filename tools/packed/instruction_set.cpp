// The processor is asked by the compiler's own means, which look at the operating system's part as well.
#include "tools/packed/instruction_set.h"

#include <algorithm>
#include <iterator>

namespace pastern::packed {
namespace {

bool has(InstructionSet set) {
  switch (set) {
#if defined(__x86_64__) && !defined(PASTERN_LANES_PLAIN_ONLY)
    case InstructionSet::plain:
      return true;
    case InstructionSet::avx2:
      return __builtin_cpu_supports("avx2") != 0 && __builtin_cpu_supports("fma") != 0;
    case InstructionSet::avx512:
      return has(InstructionSet::avx2) && __builtin_cpu_supports("avx512f") != 0 &&
             __builtin_cpu_supports("avx512dq") != 0 && __builtin_cpu_supports("avx512vl") != 0 &&
             __builtin_cpu_supports("avx512bw") != 0;
#elif defined(__aarch64__)
    case InstructionSet::neon:
      return true;
#else
    case InstructionSet::plain:
      return true;
#endif
    default:
      return false;
  }
}

constexpr InstructionSet kAll[] = {InstructionSet::plain, InstructionSet::neon, InstructionSet::avx2,
                                   InstructionSet::avx512};

std::string choice() {
  std::string names;
  for (const InstructionSet set : sets_here()) {
    if (!names.empty()) names += ", ";
    names += name_of(set);
  }
  return names;
}

}  // namespace

std::string_view name_of(InstructionSet set) {
  switch (set) {
    case InstructionSet::neon:
      return "neon";
    case InstructionSet::avx2:
      return "avx2";
    case InstructionSet::avx512:
      return "avx512";
    default:
      return "plain";
  }
}

std::string words_for(InstructionSet set) {
  switch (set) {
    case InstructionSet::neon:
      return "NEON: 4 robots at once in float, 2 in double";
    case InstructionSet::avx2:
      return "AVX2: 8 robots at once in float, 4 in double";
    case InstructionSet::avx512:
      return "AVX-512: 16 robots at once in float, 8 in double";
    default:
      return "plain instructions: 4 robots at once in float, 2 in double";
  }
}

std::vector<InstructionSet> sets_here() {
  std::vector<InstructionSet> sets;
  std::copy_if(std::begin(kAll), std::end(kAll), std::back_inserter(sets), has);
  return sets;
}

InstructionSet widest_set() { return sets_here().back(); }

std::optional<InstructionSet> set_named(std::string_view name, std::string& error) {
  if (name.empty()) return widest_set();
  for (const InstructionSet set : kAll) {
    if (name_of(set) != name) continue;
    if (has(set)) return set;
    error = "instruction set '" + std::string(name) + "': this machine does not have it; it runs " + choice();
    return std::nullopt;
  }
  error = "instruction set '" + std::string(name) + "': no such set; this machine runs " + choice();
  return std::nullopt;
}

}  // namespace pastern::packed
