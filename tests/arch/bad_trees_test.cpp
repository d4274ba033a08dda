// Small bad trees: each breaks one rule, and the rule must say so in its own words; a small good tree breaks
// none.
#include <gtest/gtest.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <map>

#include "tests/arch/rules.h"

namespace pastern::arch {
namespace {

namespace fs = std::filesystem;

constexpr const char* kLayers =
    "# comment\n"
    "runtime/hal  -> safety : frames\n"
    "runtime/link -> proto  : messages\n"
    "tools        -> runtime/link : talks to the robot\n";

class SmallTree {
 public:
  SmallTree() {
    std::string pattern = (fs::temp_directory_path() / "pastern_arch_XXXXXX").string();
    root_ = mkdtemp(pattern.data());
    write("CMakeLists.txt", "");
    write("README.md", "");
    write(".gitignore", "/build*/\n*.pyc\n");
    write("build-asan/left.cpp", "#include \"nonsense\"\n");
    write("proto/pastern/v1/robot.proto", "");
    write("safety/frames.h",
          "#include <array>\nclass DriveCommand {\n public:\n private:\n  friend class Gate;\n  "
          "DriveCommand() = default;\n};\n");
    write("safety/gate.cpp",
          "#include \"safety/frames.h\"\nDriveCommand judge() {\n  DriveCommand command;\n  return "
          "command;\n}\n");
    write("runtime/hal/pastern_hal.h", "");
    write("runtime/hal/drives.cpp",
          "#include \"runtime/hal/pastern_hal.h\"\n#include \"safety/frames.h\"\nvoid* p = dlopen(0, 0);\n");
    write("runtime/link/wire.h", "");
    write("runtime/link/wire.cpp",
          "#include <zmq.h>\n#include \"pastern/v1/robot.pb.h\"\n#include \"runtime/link/wire.h\"\n");
    write(
        "tools/main.cpp",
        "#include <fmt/core.h>\n#include \"runtime/link/wire.h\"\nvoid take(const DriveCommand& command);\n");
    write("tests/any_test.cpp",
          "#include \"tools/main.cpp\"\n#include \"safety/frames.h\"\nDriveCommand a = judge();\n");
    write("tests/must_not_compile/made.cpp", "DriveCommand command;\n");
    write("tests/must_not_compile/CMakeLists.txt", "pair(made.cpp)\n");
  }
  ~SmallTree() { fs::remove_all(root_); }
  SmallTree(const SmallTree&) = delete;
  SmallTree& operator=(const SmallTree&) = delete;

  void write(const std::string& path, const std::string& text) const {
    fs::create_directories((root_ / path).parent_path());
    std::ofstream(root_ / path) << text;
  }
  [[nodiscard]] Tree tree() const { return read_tree(root_); }
  [[nodiscard]] std::string commands() const {
    std::string text;
    for (const Source& source : tree().sources) {
      if (source.path.find(".cpp") != std::string::npos &&
          source.path.find("must_not_compile") == std::string::npos) {
        text += "  \"file\": \"" + (root_ / source.path).string() + "\"\n";
      }
    }
    return text;
  }

  /// All findings of all rules.
  [[nodiscard]] Findings all(const std::string& layers_text = kLayers) const {
    const Layers layers = read_layers(layers_text);
    const Tree now = tree();
    Findings findings = layers.findings;
    for (const Findings& more :
         {check_top_level(now), check_includes(now, layers), check_arrows_used(now, layers),
          check_safety_is_standard(now), check_onboard_libraries(now), check_nothing_below_sees_above(now),
          check_one_caller_of_the_table(now), check_drive_command(now),
          check_everything_is_compiled(now, commands_or_given())}) {
      findings.insert(findings.end(), more.begin(), more.end());
    }
    return findings;
  }

  std::string given_commands;

 private:
  [[nodiscard]] std::string commands_or_given() const {
    return given_commands.empty() ? commands() : given_commands;
  }
  fs::path root_;
};

void expect_only(const Findings& findings, const std::string& words) {
  ASSERT_EQ(findings.size(), 1u) << (findings.empty() ? "nothing was found"
                                                      : findings[0] + "\n" + findings[1]);
  EXPECT_NE(findings[0].find(words), std::string::npos) << findings[0];
}

TEST(BadTree, TheGoodOneHasNoFinding) {
  const SmallTree small;
  const Findings findings = small.all();
  EXPECT_TRUE(findings.empty()) << findings[0];
}

TEST(BadTree, AnIncludeWithoutAnArrow) {
  const SmallTree small;
  small.write("runtime/link/bad.cpp", "int a;\n#include \"safety/frames.h\"\n");
  expect_only(small.all(),
              "runtime/link/bad.cpp:2: runtime/link may not include \"safety/frames.h\": no arrow to safety");
}

TEST(BadTree, AnIncludeAgainstAnArrow) {
  const SmallTree small;
  small.write("safety/bad.h", "#include \"runtime/hal/pastern_hal.h\"\n");
  const Findings findings = small.all();
  ASSERT_EQ(findings.size(), 4u);  // two callers of the table, listed, beside it
  EXPECT_NE(findings[0].find("safety may not include"), std::string::npos);
}

TEST(BadTree, AMessageWithoutAnArrow) {
  const SmallTree small;
  small.write("runtime/hal/bad.cpp", "#include \"pastern/v1/robot.pb.h\"\n");
  expect_only(small.all(), "no arrow to proto");
}

TEST(BadTree, AnIncludeThatIsNotFromTheRoot) {
  const SmallTree small;
  small.write("runtime/link/bad.cpp", "#include \"wire.h\"\n");
  expect_only(small.all(), "found \"wire.h\", expected a path from the root of the tree");
}

TEST(BadTree, AMessageThatNoSchemaHolds) {
  const SmallTree small;
  small.write("runtime/link/bad.cpp", "#include \"pastern/v1/ghost.pb.h\"\n");
  expect_only(small.all(), "found \"pastern/v1/ghost.pb.h\"");
}

TEST(BadTree, AFileOutsideTheKnownFolders) {
  const SmallTree small;
  small.write("runtime/loose.cpp", "\n");
  expect_only(small.all(), "runtime/loose.cpp: in no folder that layers.txt knows");
}

TEST(BadTree, AnArrowThatNobodyUses) {
  const SmallTree small;
  expect_only(small.all(std::string(kLayers) + "tools -> proto : for later\n"),
              "layers.txt:5: no include line uses the arrow tools -> proto");
}

TEST(BadTree, AnArrowUsedInACommentOrAStringOnly) {
  const SmallTree small;
  small.write("tools/bad.cpp",
              "/*\n#include \"proto/x.h\"\n*/\n// #include \"proto/x.h\"\nconst char* k = R\"(\n#include "
              "\"proto/x.h\"\n)\";\n");
  expect_only(small.all(std::string(kLayers) + "tools -> proto : for later\n"),
              "no include line uses the arrow");
}

TEST(BadTree, AnArrowWithoutAReasonTwiceOrInACircle) {
  const SmallTree small;
  expect_only(small.all(std::string(kLayers) + "tools -> safety\n"),
              "expected \"folder -> folder : reason\"");
  expect_only(small.all(std::string(kLayers) + "tools -> runtime/link : again\n"), "stands twice");
  const Findings circle = small.all(std::string(kLayers) + "safety -> runtime/hal : back\n");
  ASSERT_EQ(circle.size(), 2u);  // nobody uses it either
  EXPECT_NE(circle[0].find("arrows in a circle: "), std::string::npos) << circle[0];
}

TEST(BadTree, ASystemHeaderInSafety) {
  const SmallTree small;
  for (const char* header : {"unistd.h", "sys/mman.h", "Eigen/Core", "math.h"}) {
    small.write("safety/bad.cpp", std::string("#include <") + header + ">\n");
    expect_only(small.all(), std::string("safety/bad.cpp:1: found <") + header +
                                 ">, expected the C++ standard library only");
  }
}

TEST(BadTree, AGroundLibraryOnTheRobot) {
  const SmallTree small;
  small.write("runtime/link/bad.cpp", "#include <fmt/core.h>\n");
  expect_only(small.all(), "found <fmt/core.h>, a library that does not go on the robot");
}

TEST(BadTree, SomethingElseAtTheTop) {
  const SmallTree small;
  small.write("scripts/run.sh", "");
  expect_only(small.all(), "scripts: does not belong at the top level");
}

TEST(BadTree, TheRuntimeNamesTheStubOrTheTools) {
  const SmallTree small;
  for (const char* code :
       {"auto r = pastern::stub::SimulatedRobot();\n", "int hal_stub;\n", "using namespace tools;\n"}) {
    small.write("runtime/link/bad.cpp", code);
    expect_only(small.all(), "which is above it");
  }
  small.write("runtime/link/bad.cpp", "// hal_stub in a comment, \"tools::\" in a string, is harmless\n");
  EXPECT_TRUE(small.all().empty());
  small.write("runtime/link/CMakeLists.txt", "target_link_libraries(pastern_link PUBLIC pastern_hal_stub)\n");
  expect_only(small.all(), "runtime/link/CMakeLists.txt:1: found \"pastern_hal_stub\", which is above it");
}

TEST(BadTree, TwoCallersOfTheTableOrNone) {
  const SmallTree small;
  small.write("tools/bad.cpp", "auto f = dlsym(0, \"x\");\n");
  const Findings two = small.all();
  ASSERT_EQ(two.size(), 3u);
  EXPECT_NE(two[0].find("called by 2 files, expected exactly one"), std::string::npos);
  small.write("tools/bad.cpp", "");
  small.write("runtime/hal/drives.cpp", "#include \"safety/frames.h\"\n");
  expect_only(small.all(), "called by 0 files, expected exactly one");
}

TEST(BadTree, TheLoaderOfMpiMayLoadButNotKnowDrives) {
  const SmallTree small;
  small.write("tools/packed/ranks.cpp", "void* p = dlopen(\"libpastern_ranks.so\", 0);\n");
  EXPECT_TRUE(check_one_caller_of_the_table(small.tree()).empty());
  small.write("tools/packed/ranks.cpp",
              "void* p = dlopen(0, 0);\nauto q = dlsym(p, \"pastern_hal_entry\");\n");
  EXPECT_EQ(check_one_caller_of_the_table(small.tree()).size(), 3U);
}

TEST(BadTree, ADriveCommandMadeOutsideTheGate) {
  const SmallTree small;
  for (const char* code :
       {"DriveCommand command;\n", "auto c = safety::DriveCommand{};\n", "auto c = DriveCommand();\n",
        "auto& c = reinterpret_cast<const safety::DriveCommand&>(x);\n", "DriveCommand command{};\n",
        "auto* c = new safety::DriveCommand;\n"}) {
    small.write("runtime/hal/bad.cpp", code);
    expect_only(small.all(), "a DriveCommand is made in safety/gate*.cpp only");
  }
}

TEST(BadTree, AnotherFriendOfTheDriveCommand) {
  const SmallTree small;
  small.write(
      "safety/frames.h",
      "class DriveCommand {\n  friend class Gate;\n  friend class Other;\n  DriveCommand() = default;\n};\n");
  expect_only(small.all(), "expected exactly one friend of DriveCommand");
}

TEST(BadTree, ASourceThatNobodyCompiles) {
  SmallTree small;
  small.given_commands = small.commands();
  small.write("runtime/link/left.cpp", "\n");
  expect_only(small.all(), "runtime/link/left.cpp: compiled by no target");
  small.write("runtime/link/left.cpp.txt", "\n");
  fs::remove(small.tree().root / "runtime/link/left.cpp");
  small.write("tests/must_not_compile/forgotten.cpp", "\n");
  expect_only(small.all(), "tests/must_not_compile/forgotten.cpp: compiled by no target");
}

TEST(Scanner, HidesCommentsStringsAndNothingElse) {
  EXPECT_EQ(without_comments("a // b\nc /* d\ne */ f"), "a     \nc     \n     f");
  EXPECT_EQ(without_comments("a(\"x\\\"y\", 'z', 1'000)"), "a(      ,    , 1'000)");
  EXPECT_EQ(without_comments("R\"k(a\"b)k\" c"), "           c");
  EXPECT_EQ(without_comments("\"open\nnext"), "     \nnext");
}

}  // namespace
}  // namespace pastern::arch
