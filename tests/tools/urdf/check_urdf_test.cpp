// The verb on URDF files: exit status, one line a defect, nothing of the parser's own on the terminal.
#include <filesystem>
#include <fstream>

#include "tests/tools/run.h"
#include "tests/tools/synthetic.h"
#include "tests/tools/urdf/stilt.h"

namespace pastern::testing {
namespace {

class CheckUrdf : public ::testing::Test {
 protected:
  std::string file(const std::string& text) {
    const std::string path = folder_.path() + "/stilt.urdf";
    std::ofstream(path, std::ios::binary) << text;
    return path;
  }
  Folder folder_;
};

TEST_F(CheckUrdf, SoundFileSaysWhatIsStillMissingAndIsDone) {
  const std::string path = file(stilt());
  const Ran ran = run({"check", path});
  EXPECT_EQ(ran.exit, 0) << ran.out;
  EXPECT_EQ(ran.err, "");
  EXPECT_NE(ran.out.find(path + ": sound  stilt: 4 joints, 7 links, 7.4 kg"), std::string::npos) << ran.out;
  EXPECT_NE(ran.out.find("URDF does not say, and a robot file needs besides:"), std::string::npos) << ran.out;
  EXPECT_NE(ran.out.find("joints[].stance_rad (4 joints)"), std::string::npos) << ran.out;
}

TEST_F(CheckUrdf, FindingsAreOneAndTheParserIsQuiet) {
  // The parser itself has an opinion on each of these.
  for (const auto& [from, to] :
       {std::pair("effort=\"30\"", ""), std::pair("xyz=\"0 0 -0.22\"", "xyz=\"a b c\""),
        std::pair("<link name=\"left_foot\"/>", "<link name=\"deck\"/>"), std::pair("</robot>", "")}) {
    const std::string path = file(stilt_with(from, to));
    const Ran ran = run({"check", path});
    EXPECT_EQ(ran.exit, 1) << ran.out;
    EXPECT_EQ(ran.err, "");
    for (const std::string& line : lines_of(ran.out)) {
      const bool ours = line.rfind(path + ": ", 0) == 0 || line.find("finding") != std::string::npos ||
                        line.find("pastern check") != std::string::npos;
      EXPECT_TRUE(ours) << line;
    }
  }
}

TEST_F(CheckUrdf, FileThatCannotBeReadIsThree) {
  EXPECT_EQ(run({"check", folder_.path() + "/none.urdf"}).exit, 3);
  std::filesystem::create_directory(folder_.path() + "/a.urdf");
  EXPECT_EQ(run({"check", folder_.path() + "/a.urdf"}).exit, 3);
}

TEST_F(CheckUrdf, JsonHoldsFindingsAndWhatIsMissing) {
  const Ran sound = run({"check", "--json", file(stilt())});
  EXPECT_EQ(sound.exit, 0);
  EXPECT_EQ(lines_of(sound.out).size(), 1U);
  EXPECT_NE(sound.out.find("\"kind\": \"urdf\""), std::string::npos) << sound.out;
  EXPECT_NE(sound.out.find("\"still_missing\": [\"cycle_hz\""), std::string::npos) << sound.out;
  const Ran bad = run({"check", "--json", file(stilt_with("<mass value=\"4\"/>", "<mass value=\"0\"/>"))});
  EXPECT_EQ(bad.exit, 1);
  EXPECT_NE(bad.out.find("\"field\": \"link deck (line 3) mass\""), std::string::npos) << bad.out;
}

}  // namespace
}  // namespace pastern::testing
