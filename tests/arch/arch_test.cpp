// The rules of the architecture on this very tree.
#include <gtest/gtest.h>

#include <fstream>
#include <sstream>

#include "tests/arch/rules.h"

namespace pastern::arch {
namespace {

std::string read_file(const std::string& path) {
  std::ostringstream text;
  text << std::ifstream(path).rdbuf();
  return text.str();
}

std::string lines(const Findings& findings) {
  std::string text;
  for (const std::string& finding : findings) {
    text += finding + "\n";
  }
  return text;
}

const Tree& tree() {
  static const Tree kTree = read_tree(PASTERN_SOURCE_DIR);
  return kTree;
}

const Layers& layers() {
  static const Layers kLayers = read_layers(read_file(PASTERN_SOURCE_DIR "/tests/arch/layers.txt"));
  return kLayers;
}

TEST(Architecture, TheTreeWasReadAtAll) {
  EXPECT_GT(tree().sources.size(), 50u);
  EXPECT_GT(layers().arrows.size(), 20u);
  std::size_t includes = 0;
  for (const Source& source : tree().sources) {
    includes += source.includes.size();
  }
  EXPECT_GT(includes, 200u);
}

TEST(Architecture, LayersAreArrowsWithReasonsAndNoCircle) { EXPECT_EQ(lines(layers().findings), ""); }
TEST(Architecture, OnlyWhatBelongsStandsAtTheTop) { EXPECT_EQ(lines(check_top_level(tree())), ""); }
TEST(Architecture, EveryIncludeFollowsAnArrow) { EXPECT_EQ(lines(check_includes(tree(), layers())), ""); }
TEST(Architecture, EveryArrowIsUsed) { EXPECT_EQ(lines(check_arrows_used(tree(), layers())), ""); }
TEST(Architecture, SafetyIncludesTheStandardLibraryOnly) {
  EXPECT_EQ(lines(check_safety_is_standard(tree())), "");
}
TEST(Architecture, OnlyAllowedLibrariesGoOnTheRobot) {
  EXPECT_EQ(lines(check_onboard_libraries(tree())), "");
}
TEST(Architecture, NothingBelowSeesStubOrTools) {
  EXPECT_EQ(lines(check_nothing_below_sees_above(tree())), "");
}
TEST(Architecture, OneFileCallsTheTableOfDrives) {
  EXPECT_EQ(lines(check_one_caller_of_the_table(tree())), "");
}
TEST(Architecture, OnlyTheGateMakesADriveCommand) { EXPECT_EQ(lines(check_drive_command(tree())), ""); }

TEST(Architecture, EverySourceIsCompiled) {
  const std::string commands = read_file(PASTERN_BINARY_DIR "/compile_commands.json");
  ASSERT_FALSE(commands.empty());
  EXPECT_EQ(lines(check_everything_is_compiled(tree(), commands)), "");
}

}  // namespace
}  // namespace pastern::arch
