// check: what is shipped is sound; what is damaged is told in one line a defect.
#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <iterator>

#include "proto/files/policy_file.h"
#include "tests/tools/run.h"
#include "tests/tools/synthetic.h"

namespace pastern::testing {
namespace {

namespace fs = std::filesystem;

std::string contents(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(file), {}};
}

std::string shipped(const std::string& path) { return std::string(PASTERN_SOURCE_DIR) + "/" + path; }

class CheckTest : public ::testing::Test {
 protected:
  std::string file(const std::string& name, const std::string& bytes) {
    const std::string path = folder_.path() + "/" + name;
    std::ofstream(path, std::ios::binary) << bytes;
    return path;
  }
  /// The shipped robot with one word put in another's place.
  std::string robot_with(const std::string& from, const std::string& to) {
    std::string text = contents(shipped("hal_stub/robots/dunlin12.robot.txtpb"));
    const std::size_t at = text.find(from);
    EXPECT_NE(at, std::string::npos) << from;
    return file("mine.robot.txtpb", text.replace(at, from.size(), to));
  }
  Folder folder_;
};

TEST_F(CheckTest, EverythingShippedIsSound) {
  std::vector<std::string> arguments = {"check"};
  for (const char* folder : {"hal_stub/robots", "hal_stub/scenarios", "hal_stub/policies", "tools/plans"}) {
    if (!fs::exists(shipped(folder))) continue;
    for (const auto& entry : fs::directory_iterator(shipped(folder))) {
      const std::string path = entry.path().string();
      if (path.find(".txtpb") != std::string::npos || entry.path().extension() == ".policy")
        arguments.push_back(path);
    }
  }
  ASSERT_GT(arguments.size(), 10U);
  const Ran ran = run(arguments);
  EXPECT_EQ(ran.exit, 0) << ran.out << ran.err;
  EXPECT_EQ(lines_of(ran.out).size(), arguments.size());  // a line a file, and what comes next
}

TEST_F(CheckTest, EveryDefectIsALineThatNamesFileFieldFoundAndExpected) {
  const std::string path =
      file("mine.plan.txtpb",
           "name: \"mine\"\nadaptation { kind: ES_GRADIENT batch: 0 }\nseed: 1\nwalk_s: nan\n"
           "baseline_walks: 5\nsearch_walks: 50\nconfirmation_pairs: 4\nconfirmation_level: 0.05\n"
           "max_falls: 5\nmax_minutes: 60\nmax_void_repeats: 3\n");
  const Ran ran = run({"check", path});
  EXPECT_EQ(ran.exit, 1);
  int defects = 0;
  for (const std::string& line : lines_of(ran.out)) {
    if (line.rfind(path + ": ", 0) != 0) continue;
    ++defects;
    EXPECT_NE(line.find("found "), std::string::npos) << line;
    EXPECT_NE(line.find(", expected "), std::string::npos) << line;
  }
  // batch, walk_s, confirmation_pairs, go_by
  EXPECT_EQ(defects, 4) << ran.out;
  for (const char* field : {"adaptation.batch", "walk_s", "confirmation_pairs", "go_by"}) {
    EXPECT_NE(ran.out.find(path + ": " + field + ": "), std::string::npos) << field << "\n" << ran.out;
  }
  EXPECT_NE(ran.out.find("4 findings in 1 file"), std::string::npos);
}

TEST_F(CheckTest, JsonHoldsTheSameFindings) {
  const std::string path = robot_with("cycle_hz: 1000", "cycle_hz: -1000");
  const Ran words = run({"check", path});
  const Ran json = run({"check", "--json", path});
  EXPECT_EQ(words.exit, 1);
  EXPECT_EQ(json.exit, 1);
  EXPECT_EQ(lines_of(json.out).size(), 1U);
  EXPECT_NE(json.out.find("\"field\": \"cycle_hz\""), std::string::npos) << json.out;
  EXPECT_NE(json.out.find("\"sound\": false"), std::string::npos);
}

TEST_F(CheckTest, FileThatCannotBeReadIsThree) {
  const Ran missing = run({"check", folder_.path() + "/none.robot.txtpb"});
  EXPECT_EQ(missing.exit, 3);
  EXPECT_NE(missing.out.find("none.robot.txtpb: found"), std::string::npos) << missing.out;
  fs::create_directory(folder_.path() + "/a.plan.txtpb");
  EXPECT_EQ(run({"check", folder_.path() + "/a.plan.txtpb"}).exit, 3);
}

TEST_F(CheckTest, UnknownSuffixIsTwo) {
  const Ran ran = run({"check", file("notes.txt", "hello")});
  EXPECT_EQ(ran.exit, 2);
  EXPECT_NE(ran.err.find("unknown suffix: expected .robot.txtpb"), std::string::npos) << ran.err;
}

TEST_F(CheckTest, EmptyAndTornAndForeignFilesAreFindings) {
  const std::string robot = contents(shipped("hal_stub/robots/dunlin12.robot.txtpb"));
  for (const std::string& bytes :
       {std::string(), robot.substr(0, robot.size() / 2), std::string("\0\1\2\xff", 4),
        std::string("name: \"x\"\nno_such_field: 1\n")}) {
    const Ran ran = run({"check", file("bad.robot.txtpb", bytes)});
    EXPECT_EQ(ran.exit, 1) << ran.out;
    EXPECT_NE(ran.out.find("bad.robot.txtpb:"), std::string::npos) << ran.out;
    // A terminal must not be steered by a file's bytes.
    EXPECT_TRUE(std::all_of(ran.out.begin(), ran.out.end(),
                            [](char c) { return c == '\n' || static_cast<unsigned char>(c) >= 0x20; }));
  }
}

TEST_F(CheckTest, ScenarioWantsARobotAndFitsOnlyOneThatHasItsJoints) {
  const std::string text = "name: \"mine\"\nwear { joint: \"no_such_joint\" strength: 0.5 }\n";
  const std::string path = file("mine.scenario.txtpb", text);
  const Ran alone = run({"check", path});
  EXPECT_EQ(alone.exit, 1);
  EXPECT_NE(alone.out.find("expected --robot FILE"), std::string::npos) << alone.out;
  const Ran judged = run({"check", "--robot", shipped("hal_stub/robots/dunlin8.robot.txtpb"), path});
  EXPECT_EQ(judged.exit, 1);
  EXPECT_NE(judged.out.find("no_such_joint"), std::string::npos) << judged.out;
}

TEST_F(CheckTest, ScenarioNamesEveryRobotThatItFits) {
  const std::string knee = shipped("hal_stub/scenarios/worn_knee.scenario.txtpb");
  const Ran both = run({"check", knee});
  EXPECT_EQ(both.exit, 0) << both.out;
  EXPECT_NE(both.out.find("fits dunlin12, dunlin8"), std::string::npos) << both.out;
  const Ran one = run({"check", "--robot", shipped("hal_stub/robots/dunlin8.robot.txtpb"), knee});
  EXPECT_NE(one.out.find("fits dunlin8\n"), std::string::npos) << one.out;
  const std::string text = "name: \"mine\"\nwear { joint: \"front_left_abduction\" strength: 0.5 }\n";
  const Ran some = run({"check", shipped("hal_stub/robots/dunlin8.robot.txtpb"),
                        shipped("hal_stub/robots/dunlin12.robot.txtpb"), file("mine.scenario.txtpb", text)});
  EXPECT_NE(some.out.find("mine: fits dunlin12; does not fit dunlin8"), std::string::npos) << some.out;
  const Ran none =
      run({"check", shipped("hal_stub/robots/dunlin8.robot.txtpb"),
           shipped("hal_stub/robots/dunlin12.robot.txtpb"),
           file("bad.scenario.txtpb", "name: \"bad\"\nwear { joint: \"tail\" strength: 0.5 }\n")});
  EXPECT_EQ(none.exit, 1);
  EXPECT_NE(none.out.find("(judged against dunlin"), std::string::npos) << none.out;
}

TEST_F(CheckTest, PlanThatCouldSearchNothingIsAFinding) {
  const std::string text =
      "name: \"mine\"\nadaptation { kind: ES_GRADIENT }\nseed: 1\nwalk_s: 5\n"
      "baseline_walks: 5\nsearch_walks: 9\nconfirmation_pairs: 8\nconfirmation_level: 0.05\n"
      "max_falls: 5\nmax_minutes: 2\nmax_void_repeats: 3\ngo_by: AUTO\n";
  const Ran ran = run({"check", file("mine.plan.txtpb", text)});
  EXPECT_EQ(ran.exit, 1);
  EXPECT_NE(ran.out.find("search_walks: found 9, expected at least 10, the first batch of ES_GRADIENT\n"),
            std::string::npos)
      << ran.out;
  EXPECT_NE(ran.out.find("max_minutes: found 2, expected at least 2.58"), std::string::npos) << ran.out;
}

TEST_F(CheckTest, DamagedPolicyIsToldAndNeverSound) {
  const std::string bytes = files::pack_policy(small_policy());
  const std::string robot = shipped("hal_stub/robots/dunlin8.robot.txtpb");
  std::string flipped = bytes;
  flipped[bytes.size() / 2] = static_cast<char>(flipped[bytes.size() / 2] ^ 1);
  // Whole, it is of another robot; the rest is no policy file at all.
  for (const std::string& damaged : {bytes, flipped, bytes.substr(0, 30), bytes + "x"}) {
    const Ran ran = run({"check", "--robot", robot, file("bad.policy", damaged)});
    EXPECT_EQ(ran.exit, 1) << ran.out;
    EXPECT_EQ(ran.out.find("sound"), std::string::npos) << ran.out;
  }
}

TEST_F(CheckTest, DefectiveRobotOfAPolicyIsToldToo) {
  const std::string robot = robot_with("cycle_hz: 1000", "cycle_hz: 1e9");
  const Ran ran = run({"check", "--robot", robot, file("a.policy", files::pack_policy(small_policy()))});
  EXPECT_EQ(ran.exit, 1);
  EXPECT_NE(ran.out.find("cycle_hz"), std::string::npos) << ran.out;
}

}  // namespace
}  // namespace pastern::testing
