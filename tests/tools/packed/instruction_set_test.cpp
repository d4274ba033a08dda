// Which instructions are chosen, and what a person reads.
#include "tools/packed/instruction_set.h"

#include <gtest/gtest.h>

#include <algorithm>

namespace pastern::packed {
namespace {

TEST(InstructionSet, TheWidestOfThisMachineIsChosenWhenNobodyAsks) {
  std::string error;
  EXPECT_EQ(set_named("", error), widest_set());
  EXPECT_EQ(widest_set(), sets_here().back());
  EXPECT_TRUE(error.empty());
}

TEST(InstructionSet, EachSetOfThisMachineCanBeAskedForByName) {
  for (const InstructionSet set : sets_here()) {
    std::string error;
    EXPECT_EQ(set_named(name_of(set), error), set);
    EXPECT_TRUE(error.empty());
    EXPECT_NE(words_for(set).find("robots at once"), std::string::npos);
  }
}

TEST(InstructionSet, ANameThatIsNoneIsRefusedWithTheChoice) {
  for (const char* name : {"avx1024", "AVX2 ", "fastest"}) {
    std::string error;
    EXPECT_FALSE(set_named(name, error));
    EXPECT_NE(error.find("'" + std::string(name) + "'"), std::string::npos) << error;
    EXPECT_NE(error.find(name_of(sets_here().front())), std::string::npos) << error;
    EXPECT_EQ(error.find('\n'), std::string::npos);
  }
}

TEST(InstructionSet, ASetThatThisMachineLacksIsRefused) {
  for (const InstructionSet set :
       {InstructionSet::plain, InstructionSet::neon, InstructionSet::avx2, InstructionSet::avx512}) {
    const auto here = sets_here();
    const bool has = std::find(here.begin(), here.end(), set) != here.end();
    std::string error;
    EXPECT_EQ(set_named(name_of(set), error).has_value(), has);
    EXPECT_EQ(error.find("does not have it") == std::string::npos, has) << error;
  }
}

}  // namespace
}  // namespace pastern::packed
