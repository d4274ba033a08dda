// All sets in one program: each set's code is called, the plain program's own templates stay plain.
#include <gtest/gtest.h>

#include <cmath>
#include <stdexcept>
#include <string>
#include <vector>

#include "tools/packed/instruction_set.h"

namespace pastern::packed {
#define PASTERN_PROBE(set)                           \
  namespace set {                                    \
  double probed(const std::vector<double>& numbers); \
  }
PASTERN_LANES_EACH_SET(PASTERN_PROBE)

namespace {

double probed(InstructionSet set, const std::vector<double>& numbers) {
#define PASTERN_PROBE_CASE(name) \
  if (name_of(set) == #name) return name::probed(numbers);
  PASTERN_LANES_EACH_SET(PASTERN_PROBE_CASE)
  return 0;
}

TEST(Apart, EachSetsCodeRunsInOneProgram) {
  std::vector<double> numbers;
  for (int i = 0; i < 5; ++i) numbers.push_back(0.1 * i);
  double plain = 0;
  for (const double a : numbers) plain += std::exp(a);
  for (const InstructionSet set : sets_here()) {
    EXPECT_NEAR(probed(set, numbers), plain, 1e-14) << name_of(set);
    EXPECT_THROW(static_cast<void>(probed(set, {})), std::invalid_argument);
  }
}

}  // namespace
}  // namespace pastern::packed
