// keys: from nothing to a robot that one laptop may command, on folders alone.
#include <gtest/gtest.h>
#include <sys/stat.h>

#include <fstream>

#include "tests/tools/run.h"
#include "tests/tools/synthetic.h"

namespace pastern::testing {
namespace {

class KeysTest : public ::testing::Test {
 protected:
  KeysTest() : robot_(folder_.path() + "/robot"), ground_(folder_.path() + "/ground") {
    mkdir(robot_.c_str(), 0700);
    mkdir(ground_.c_str(), 0700);
  }
  Folder folder_;
  std::string robot_;
  std::string ground_;
};

TEST_F(KeysTest, MadeHandedOverListedRevoked) {
  EXPECT_EQ(run({"keys", "make", "robot", "--folder", robot_}).exit, 0);
  EXPECT_EQ(run({"keys", "make", "ida", "--folder", ground_}).exit, 0);
  EXPECT_EQ(run({"keys", "trust", robot_ + "/robot.public", "--folder", ground_}).exit, 0);
  const Ran allowed = run(
      {"keys", "allow", "ida", "--file", ground_ + "/ida.public", "--may", "command", "--folder", robot_});
  EXPECT_EQ(allowed.exit, 0) << allowed.err;
  const Ran listed = run({"keys", "list", "--folder", robot_});
  EXPECT_EQ(listed.exit, 0) << listed.err;
  EXPECT_NE(listed.out.find("ida    command, watch"), std::string::npos) << listed.out;
  EXPECT_EQ(run({"keys", "revoke", "ida", "--folder", robot_}).exit, 0);
  EXPECT_EQ(run({"keys", "list", "--folder", robot_}).out.find("ida"), std::string::npos);
  struct stat secret {};
  ASSERT_EQ(stat((ground_ + "/ida.secret").c_str(), &secret), 0);
  EXPECT_EQ(secret.st_mode & 0777U, 0600U);
}

TEST_F(KeysTest, WrongFilesAndNamesAreOneLine) {
  std::ofstream(folder_.path() + "/short.public") << "abc\n";
  for (const std::vector<std::string>& words :
       {std::vector<std::string>{"keys", "trust", folder_.path() + "/short.public", "--folder", ground_},
        {"keys", "trust", folder_.path() + "/none.public", "--folder", ground_},
        {"keys", "revoke", "nobody", "--folder", robot_},
        {"keys", "make", "../out", "--folder", ground_},
        {"keys", "list", "--folder", folder_.path() + "/none"}}) {
    const Ran ran = run(words);
    EXPECT_EQ(ran.exit, 3) << words[1] << " " << words[2];
    EXPECT_EQ(lines_of(ran.err).size(), 1U) << ran.err;
    EXPECT_EQ(ran.out, "");
  }
}

TEST_F(KeysTest, SecondPairOfTheSameNameDoesNotReplaceTheFirst) {
  EXPECT_EQ(run({"keys", "make", "ida", "--folder", ground_}).exit, 0);
  EXPECT_EQ(run({"keys", "make", "ida", "--folder", ground_}).exit, 3);
}

}  // namespace
}  // namespace pastern::testing
