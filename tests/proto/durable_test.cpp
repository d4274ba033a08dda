// Whole files are written or not written, and the old one stays until the new one stands.
#include "proto/files/durable.h"

#include <fcntl.h>
#include <gtest/gtest.h>
#include <sched.h>
#include <sys/mount.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include <csignal>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <functional>

#include "proto/files/text.h"

namespace pastern::files {
namespace {

namespace fs = std::filesystem;

class Durable : public ::testing::Test {
 protected:
  void SetUp() override {
    std::string pattern = (fs::temp_directory_path() / "durable.XXXXXX").string();
    ASSERT_NE(::mkdtemp(pattern.data()), nullptr);
    folder_ = pattern;
  }
  void TearDown() override {
    std::error_code ignored;
    fs::remove_all(folder_, ignored);
  }

  [[nodiscard]] std::string path(const std::string& name) const { return (folder_ / name).string(); }
  static std::string content(const std::string& file) {
    std::ifstream in(file, std::ios::binary);
    return {std::istreambuf_iterator<char>(in), {}};
  }
  [[nodiscard]] int entries() const {
    return static_cast<int>(std::distance(fs::directory_iterator(folder_), fs::directory_iterator()));
  }

  // Runs `work` in a process of its own, so that limits and mounts end with it. Its result is the exit
  // status.
  static int elsewhere(const std::function<int()>& work) {
    const pid_t child = ::fork();
    if (child == 0) ::_exit(work());
    int status = 0;
    ::waitpid(child, &status, 0);
    return WIFEXITED(status) ? WEXITSTATUS(status) : 255;
  }

  fs::path folder_;
};

TEST_F(Durable, WritesExactlyTheBytesWithTheMode) {
  Defects defects;
  const std::string bytes("a\0b\n\xff", 5);
  ASSERT_TRUE(write_durably(path("x"), bytes, 0600, defects)) << lines(defects);
  EXPECT_EQ(content(path("x")), bytes);
  EXPECT_EQ(fs::status(path("x")).permissions(), fs::perms::owner_read | fs::perms::owner_write);
  ASSERT_TRUE(write_durably(path("x"), "", 0644, defects));
  EXPECT_EQ(content(path("x")), "");
  EXPECT_EQ(entries(), 1);
  EXPECT_TRUE(defects.empty());
}

TEST_F(Durable, WritesInTheWorkingFolderWithoutAnySlash) {
  const int status = elsewhere([&] {
    Defects defects;
    return ::chdir(folder_.c_str()) == 0 && write_durably("plain", "1", 0644, defects) ? 0 : 1;
  });
  EXPECT_EQ(status, 0);
  EXPECT_EQ(content(path("plain")), "1");
}

// A file-size limit makes write() fail half-way, as a full disk does.
TEST_F(Durable, AWriteThatFailsHalfWayLeavesTheOldFileAndNothingBesideIt) {
  Defects defects;
  ASSERT_TRUE(write_durably(path("x"), "old", 0644, defects));
  const int status = elsewhere([&] {
    std::signal(SIGXFSZ, SIG_IGN);
    const rlimit limit{4096, 4096};
    if (::setrlimit(RLIMIT_FSIZE, &limit) != 0) return 2;
    Defects inner;
    if (write_durably(path("x"), std::string(100'000, 'n'), 0644, inner)) return 3;
    return inner.size() == 1 && inner[0].found.find("while writing") != std::string::npos ? 0 : 4;
  });
  EXPECT_EQ(status, 0);
  EXPECT_EQ(content(path("x")), "old");
  EXPECT_EQ(entries(), 1);
}

// The same on a real full disk where mounting in a namespace of one's own is permitted; elsewhere the test
// above stands for it.
TEST_F(Durable, AFullDiskLeavesTheOldFile) {
  const int status = elsewhere([&] {
    if (::unshare(CLONE_NEWNS | (::getuid() == 0 ? 0 : CLONE_NEWUSER)) != 0) return 77;
    if (::mount("none", "/", nullptr, MS_REC | MS_PRIVATE, nullptr) != 0) return 77;
    if (::mount("none", folder_.c_str(), "tmpfs", 0, "size=64k") != 0) return 77;
    Defects inner;
    if (!write_durably(path("x"), "old", 0644, inner)) return 2;
    if (write_durably(path("x"), std::string(1'000'000, 'n'), 0644, inner)) return 3;
    if (inner.size() != 1 || inner[0].line().find("No space left on device") == std::string::npos) return 4;
    if (content(path("x")) != "old" || entries() != 1) return 5;
    return write_durably(path("x"), "new", 0644, inner) && content(path("x")) == "new" ? 0 : 6;
  });
  EXPECT_TRUE(status == 0 || status == 77) << status;
}

TEST_F(Durable, AFolderThatMayNotBeWrittenIsRefusedInOneLine) {
  ASSERT_EQ(::chmod(folder_.c_str(), 0555), 0);
  const int status = elsewhere([&] {
    if (::getuid() == 0 && ::setuid(65534) != 0) return 2;  // root may write anywhere
    Defects inner;
    if (write_durably(path("x"), "1", 0644, inner)) return 3;
    return inner.size() == 1 && inner[0].file == path("x") ? 0 : 4;
  });
  ASSERT_EQ(::chmod(folder_.c_str(), 0755), 0);
  EXPECT_EQ(status, 0);
  EXPECT_EQ(entries(), 0);
}

TEST_F(Durable, RefusesAMissingFolderAFolderInPlaceOfTheFileAndADevice) {
  Defects defects;
  EXPECT_FALSE(write_durably(path("none/x"), "1", 0644, defects));
  ASSERT_TRUE(fs::create_directory(path("d")));
  EXPECT_FALSE(write_durably(path("d"), "1", 0644, defects));
  EXPECT_FALSE(write_durably("/dev/full", "1", 0644, defects));
  ASSERT_TRUE(write_durably(path("f"), "1", 0644, defects));
  EXPECT_FALSE(write_durably(path("f/x"), "1", 0644, defects));
  EXPECT_FALSE(write_durably("", "1", 0644, defects));
  EXPECT_EQ(defects.size(), 5U) << lines(defects);
}

class Reading : public Durable {};

TEST_F(Reading, GivesTheBytesAndRefusesWhatIsNoFile) {
  Defects defects;
  const std::string bytes("a\0b", 3);
  ASSERT_TRUE(write_durably(path("x"), bytes, 0644, defects));
  EXPECT_EQ(read_whole(path("x"), defects), bytes);
  EXPECT_FALSE(read_whole(path("none"), defects));
  EXPECT_FALSE(read_whole(folder_.string(), defects));
  EXPECT_FALSE(read_whole("/dev/zero", defects));
  ASSERT_EQ(::mkfifo(path("pipe").c_str(), 0600), 0);
  EXPECT_FALSE(read_whole(path("pipe"), defects));  // and does not wait for a writer
  EXPECT_EQ(defects.size(), 4U) << lines(defects);
}

TEST_F(Reading, TakesSixteenMebibytesAndNoMore) {
  Defects defects;
  ASSERT_TRUE(write_durably(path("x"), std::string(16U << 20U, ' '), 0644, defects));
  EXPECT_TRUE(read_whole(path("x"), defects));
  ASSERT_TRUE(write_durably(path("x"), std::string((16U << 20U) + 1, ' '), 0644, defects));
  EXPECT_FALSE(read_whole(path("x"), defects));
  ASSERT_EQ(defects.size(), 1U);
  EXPECT_EQ(defects[0].found, "more than 16 MiB");
}

}  // namespace
}  // namespace pastern::files
