// Key files: made, read, handed over, revoked, and every way in which they can be wrong.
#include "runtime/link/keys.h"

#include <gtest/gtest.h>
#include <sys/stat.h>

#include <fstream>

#include "runtime/link/allow_list.h"
#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

namespace fs = std::filesystem;

class KeysTest : public ::testing::Test {
 protected:
  void write(const std::string& file, const std::string& text) {
    std::ofstream(path(file), std::ios::binary | std::ios::trunc) << text;
  }
  [[nodiscard]] std::string read(const std::string& file) const {
    std::ifstream in(path(file), std::ios::binary);
    return {std::istreambuf_iterator<char>(in), {}};
  }
  [[nodiscard]] std::string path(const std::string& file) const { return folder_.path() + "/" + file; }
  void expect_one_line(const std::string& part) const {
    EXPECT_NE(error_.find(part), std::string::npos) << error_;
    EXPECT_NE(error_.find(", expected "), std::string::npos) << error_;
    EXPECT_EQ(error_.find('\n'), std::string::npos) << error_;
  }
  void make_robot() {
    ASSERT_TRUE(make_pair(folder_.path(), "robot", error_)) << error_;
    fs::create_directory(path("allowed"));
  }

  testing::Folder folder_;
  std::string error_;
  RobotKeys robot_;
  GroundKeys ground_;
};

TEST_F(KeysTest, a_pair_is_made_with_a_secret_for_its_owner_alone) {
  make_robot();
  struct stat facts {};
  ASSERT_EQ(::stat(path("robot.secret").c_str(), &facts), 0);
  EXPECT_EQ(facts.st_mode & 07777, 0600U);
  EXPECT_EQ(read("robot.secret").size(), 41U);
  EXPECT_EQ(read("robot.public").size(), 41U);
  EXPECT_NE(read("robot.secret"), read("robot.public"));
  ASSERT_TRUE(read_robot_keys(folder_.path(), robot_, error_)) << error_;
  EXPECT_EQ(robot_.public_z85 + "\n", read("robot.public"));
  EXPECT_EQ(std::distance(fs::directory_iterator(folder_.path()), {}), 3) << "no temporary file is left";
}

TEST_F(KeysTest, a_new_folder_is_closed_to_others) {
  ASSERT_TRUE(make_pair(path("new"), "anna", error_)) << error_;
  struct stat facts {};
  ASSERT_EQ(::stat(path("new").c_str(), &facts), 0);
  EXPECT_EQ(facts.st_mode & 0777, 0700U);
}

TEST_F(KeysTest, a_key_is_never_overwritten) {
  make_robot();
  const std::string before = read("robot.secret");
  EXPECT_FALSE(make_pair(folder_.path(), "robot", error_));
  expect_one_line("there already");
  fs::remove(path("robot.secret"));
  EXPECT_FALSE(make_pair(folder_.path(), "robot", error_)) << "half a pair is not overwritten either";
  EXPECT_FALSE(fs::exists(path("robot.secret")));
}

TEST_F(KeysTest, names_that_could_leave_the_folder_or_mislead_are_refused) {
  for (const std::string name : {"", ".", "..", "../x", "a/b", "a b", "a.operator", "na\nme", "\xc3\xa9",
                                 "abcdefghijklmnopqrstuvwxyz0123456"}) {
    EXPECT_FALSE(make_pair(folder_.path(), name, error_)) << name;
    expect_one_line("key name");
    EXPECT_FALSE(allow(folder_.path(), name, true, std::string(40, '0'), error_)) << name;
    EXPECT_FALSE(revoke(folder_.path(), name, error_)) << name;
  }
  EXPECT_TRUE(fs::is_empty(folder_.path()));
}

TEST_F(KeysTest, a_secret_that_others_can_read_is_refused) {
  make_robot();
  for (const mode_t mode : {0640U, 0604U, 0660U, 0620U, 0602U}) {
    ::chmod(path("robot.secret").c_str(), mode);
    EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
    expect_one_line("0600");
  }
  ::chmod(path("robot.secret").c_str(), 0400);
  EXPECT_TRUE(read_robot_keys(folder_.path(), robot_, error_)) << error_;
}

TEST_F(KeysTest, a_folder_that_others_can_write_to_is_refused) {
  make_robot();
  ::chmod(path("allowed").c_str(), 0777);
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("allowed");
  ::chmod(path("allowed").c_str(), 0755);
  ::chmod(folder_.path().c_str(), 0770);
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("others can write");
}

TEST_F(KeysTest, files_that_are_no_keys_are_refused) {
  make_robot();
  const std::string good = read("robot.secret");
  const std::string bad[] = {"",
                             "\n",
                             good.substr(0, 39),
                             good.substr(0, 20) + "\n" + good.substr(20),
                             "0" + good,
                             std::string(40, '~'),
                             std::string(40, '"'),
                             std::string(39, '0') + " ",
                             std::string(40, '\0'),
                             std::string(40, '\xff'),
                             std::string(40, '#'),  // above 2^32 in each group of five
                             std::string(10'000, '0')};
  for (const std::string& text : bad) {
    write("robot.secret", text);
    EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_)) << text.substr(0, 50);
    expect_one_line("robot.secret");
  }
  fs::remove(path("robot.secret"));
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("No such file");
  fs::create_directory(path("robot.secret"));
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("no regular file");
  EXPECT_TRUE(robot_.secret_z85.empty()) << "nothing is handed out half-read";
}

TEST_F(KeysTest, two_halves_of_different_pairs_are_refused) {
  make_robot();
  ASSERT_TRUE(make_pair(folder_.path(), "other", error_)) << error_;
  fs::rename(path("other.public"), path("robot.public"));
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("another pair");
}

TEST_F(KeysTest, ground_keys_are_one_pair_and_the_robots_public_key) {
  EXPECT_FALSE(read_ground_keys(folder_.path(), ground_, error_));
  expect_one_line("no secret key");
  ASSERT_TRUE(make_pair(folder_.path(), "anna", error_)) << error_;
  EXPECT_FALSE(read_ground_keys(folder_.path(), ground_, error_));
  expect_one_line("robot.public");
  fs::copy_file(path("anna.public"), path("robot.public"));
  ASSERT_TRUE(read_ground_keys(folder_.path(), ground_, error_)) << error_;
  EXPECT_EQ(ground_.name, "anna");
  ASSERT_TRUE(make_pair(folder_.path(), "ben", error_)) << error_;
  EXPECT_FALSE(read_ground_keys(folder_.path(), ground_, error_));
  expect_one_line("anna and ben");
}

TEST_F(KeysTest, a_robots_folder_is_no_ground_folder) {
  make_robot();
  EXPECT_FALSE(read_ground_keys(folder_.path(), ground_, error_));
  expect_one_line("robot's secret key");
}

TEST_F(KeysTest, allow_and_revoke_change_the_list) {
  make_robot();
  const std::string a(40, '1');
  const std::string b(40, '2');
  ASSERT_TRUE(allow(folder_.path(), "anna", true, a, error_)) << error_;
  ASSERT_TRUE(allow(folder_.path(), "screen", false, b, error_)) << error_;
  EXPECT_FALSE(allow(folder_.path(), "anna", false, std::string(40, '3'), error_));
  expect_one_line("revoked first");
  EXPECT_FALSE(allow(folder_.path(), "third", false, a, error_)) << "one key, one name";
  expect_one_line("'anna'");
  EXPECT_FALSE(allow(folder_.path(), "third", false, "short", error_));
  expect_one_line("public key of third");
  ASSERT_TRUE(read_robot_keys(folder_.path(), robot_, error_)) << error_;
  ASSERT_EQ(robot_.allowed.size(), 2U);
  EXPECT_EQ(robot_.allowed[0].name, "anna");
  EXPECT_TRUE(robot_.allowed[0].commander);
  EXPECT_EQ(robot_.allowed[0].public_z85, a);
  EXPECT_FALSE(robot_.allowed[1].commander);
  ASSERT_TRUE(revoke(folder_.path(), "anna", error_)) << error_;
  EXPECT_FALSE(revoke(folder_.path(), "anna", error_));
  expect_one_line("no key of the name 'anna'");
  ASSERT_TRUE(read_robot_keys(folder_.path(), robot_, error_)) << error_;
  EXPECT_EQ(robot_.allowed.size(), 1U);
}

TEST_F(KeysTest, a_list_with_a_defect_does_not_start_and_a_running_one_leaves_it_out) {
  make_robot();
  ASSERT_TRUE(allow(folder_.path(), "anna", true, std::string(40, '1'), error_)) << error_;
  write("allowed/broken.operator.public", "half a k");
  write("allowed/notes.txt", "not looked at");
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("broken.operator.public");
  std::vector<AllowedKey> listed;
  EXPECT_EQ(read_allowed(folder_.path(), listed).size(), 1U);
  ASSERT_EQ(listed.size(), 1U);
  EXPECT_EQ(listed[0].name, "anna");
}

TEST_F(KeysTest, a_key_listed_twice_does_not_start_and_has_the_lesser_role_while_running) {
  make_robot();
  write("allowed/anna.operator.public", std::string(40, '1'));
  write("allowed/bella.observer.public", std::string(40, '1'));
  EXPECT_FALSE(read_robot_keys(folder_.path(), robot_, error_));
  expect_one_line("each once");
  std::vector<AllowedKey> listed;
  (void)read_allowed(folder_.path(), listed);
  EXPECT_FALSE(by_key(listed).at(std::string(40, '1')).commander);
  std::reverse(listed.begin(), listed.end());
  EXPECT_FALSE(by_key(listed).at(std::string(40, '1')).commander);
}

}  // namespace
}  // namespace pastern::link
