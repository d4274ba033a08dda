// What the journal refuses: other files, newer schemas, damage, a second writer, folders it may not write;
// and a disk that fills up.
#include <fcntl.h>
#include <gtest/gtest.h>
#include <sqlite3.h>
#include <sys/wait.h>
#include <unistd.h>

#include <csignal>
#include <fstream>
#include <random>

#include "tests/faults/full_disk_vfs.h"
#include "tests/runtime/journal/support.h"

namespace pastern::journal {
namespace {

std::string read_file(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(file), {}};
}

void write_file(const std::string& path, const std::string& bytes) {
  std::ofstream(path, std::ios::binary) << bytes;
}

void alter(const std::string& path, const std::string& sql) {
  sqlite3* raw = nullptr;
  ASSERT_EQ(sqlite3_open(path.c_str(), &raw), SQLITE_OK);
  ASSERT_EQ(sqlite3_exec(raw, sql.c_str(), nullptr, nullptr, nullptr), SQLITE_OK) << sqlite3_errmsg(raw);
  sqlite3_close(raw);
}

/// A closed journal with one session of ten walks; its bytes.
std::string sound_bytes(const Folder& folder) {
  {
    const auto journal = opened(folder);
    begun(*journal);
    for (std::uint64_t n = 1; n <= 10; ++n) walk(*journal, episode(1, n));
    EXPECT_TRUE(journal->put("windings", "warm").ok);
  }
  return read_file(folder.file());
}

TEST(Refusal, NoFolderAndNoFile) {
  EXPECT_NE(refusal("/nonexistent/folder").find("not a folder"), std::string::npos);
  EXPECT_NE(refusal("/nonexistent/folder", true).find("cannot"), std::string::npos);
  const Folder folder;
  EXPECT_NE(refusal(folder.path(), true).find("cannot"), std::string::npos);
  EXPECT_FALSE(std::filesystem::exists(folder.file())) << "reading makes nothing";
}

TEST(Refusal, FilesThatAreNoJournal) {
  std::mt19937 engine(1);
  std::string noise(20000, '\0');
  for (char& c : noise) c = static_cast<char>(engine());
  for (const std::string& bytes :
       {noise, noise.substr(0, 1), noise.substr(0, 50), std::string(4096, '\0'), std::string("plan: 3\n")}) {
    const Folder folder;
    write_file(folder.file(), bytes);
    EXPECT_NE(refusal(folder.path()).find("not a journal"), std::string::npos) << bytes.size();
    EXPECT_TRUE(read_file(folder.file()) == bytes) << "the file was touched";
  }
  const Folder head_only;
  write_file(head_only.file(), std::string("SQLite format 3\0and then nothing", 32));
  EXPECT_NE(refusal(head_only.path()).find("cut short"), std::string::npos);
  const Folder other;
  alter(other.file(), "CREATE TABLE walks (x); INSERT INTO walks VALUES (1)");
  const std::string before = read_file(other.file());
  EXPECT_NE(refusal(other.path()).find("application id 0"), std::string::npos);
  EXPECT_TRUE(read_file(other.file()) == before);
}

TEST(Refusal, ASchemaOfAnotherVersionNewerOrOlder) {
  const Folder folder;
  sound_bytes(folder);
  alter(folder.file(), "PRAGMA user_version = 3");
  EXPECT_NE(refusal(folder.path()).find("written by a newer program: found schema version 3, expected 2"),
            std::string::npos);
  EXPECT_NE(refusal(folder.path(), true).find("newer program"), std::string::npos);
  alter(folder.file(), "PRAGMA user_version = 0");
  EXPECT_NE(refusal(folder.path()).find("found schema version 0, expected 2"), std::string::npos);
}

// Version 1 was written in two shapes: without seals, and with them but without a command's key.
TEST(Refusal, AJournalOfTheFirstSchemaInEitherShapeIsOneClearLine) {
  for (const char* shape : {"CREATE TABLE sessions (session INTEGER PRIMARY KEY, plan_text TEXT NOT NULL);"
                            "CREATE TABLE commands (id TEXT PRIMARY KEY, answer_message BLOB NOT NULL);",
                            "CREATE TABLE sessions (session INTEGER PRIMARY KEY, plan_text TEXT NOT NULL,"
                            " seal TEXT NOT NULL);"
                            "CREATE TABLE commands (id TEXT PRIMARY KEY, answer_message BLOB NOT NULL,"
                            " seal TEXT NOT NULL);"}) {
    const Folder folder;
    alter(folder.file(), shape + std::string("PRAGMA application_id = 1346458673; PRAGMA user_version = 1;"));
    const std::string before = read_file(folder.file());
    for (const bool read_only : {true, false}) {
      const std::string words = refusal(folder.path(), read_only);
      EXPECT_NE(words.find("written by an older program: found schema version 1, expected 2"),
                std::string::npos)
          << words;
      EXPECT_EQ(words.find("no such column"), std::string::npos) << words;
      EXPECT_EQ(words.find('\n'), std::string::npos) << words;
    }
    EXPECT_TRUE(read_file(folder.file()) == before) << "the file was touched";
  }
}

TEST(Refusal, AJournalCutShortAnywhere) {
  const Folder whole;
  const std::string bytes = sound_bytes(whole);
  ASSERT_GT(bytes.size(), 40000U);
  const Folder folder;
  for (std::size_t size = 1; size < bytes.size(); size += 509) {  // a prime: every place in a page comes up
    write_file(folder.file(), bytes.substr(0, size));
    std::filesystem::remove(folder.file() + "-wal");
    refusal(folder.path());
  }
}

TEST(Refusal, AFlippedBitIsRefusedOrChangesNothing) {
  const Folder whole;
  const std::string bytes = sound_bytes(whole);
  std::string digest;
  {
    const auto journal = opened(whole);
    digest = journal->digest(1);
  }
  const Folder folder;
  std::mt19937_64 engine(2);
  int refused = 0;
  for (int trial = 0; trial < 1000; ++trial) {
    std::string flipped = bytes;
    flipped[engine() % flipped.size()] ^= static_cast<char>(1U << (engine() % 8));
    write_file(folder.file(), flipped);
    for (const char* suffix : {"-wal", "-shm", "-journal"}) std::filesystem::remove(folder.file() + suffix);
    std::string error;
    const bool read_only = trial % 10 != 0;  // a writer syncs on closing, which takes its time
    const auto journal = Journal::open(folder.path(), error, "", read_only);
    if (!journal) {
      ++refused;
      EXPECT_EQ(error.find('\n'), std::string::npos) << error;
      continue;
    }
    const auto finished = journal->finished(1);
    if (!journal->failure().empty()) continue;
    ASSERT_EQ(finished.size(), 10U);
    for (std::size_t i = 0; i < 10; ++i)
      EXPECT_EQ(finished[i].evaluation.value().terms.forward, 2.5) << "trial " << trial;
  }
  EXPECT_GT(refused, 100);
}

TEST(Refusal, AWalkChangedBehindTheJournalsBack) {
  const Folder folder;
  sound_bytes(folder);
  alter(folder.file(), "UPDATE walks SET episode_message = x'0801' WHERE walk = 4");
  EXPECT_NE(refusal(folder.path()).find("walk 4 of session 1 does not match its seal"), std::string::npos);
}

TEST(Refusal, APlanAVerdictOrAKeptValueChangedBehindTheJournalsBack) {
  for (const auto& [sql, words] :
       {std::pair{"UPDATE sessions SET plan_text = 'other' WHERE session = 1", "session 1"},
        {"UPDATE sessions SET ended = 1 WHERE session = 1", "session 1"},
        {"UPDATE carried_state SET bytes = x'00'", "carried state"},
        {"UPDATE kept_values SET bytes = x'00'", "kept value windings"}}) {
    const Folder folder;
    sound_bytes(folder);
    alter(folder.file(), sql);
    EXPECT_NE(refusal(folder.path()).find(std::string(words) + " does not match its seal"), std::string::npos)
        << sql;
  }
}

TEST(Refusal, ASecondWriterInThisProcessAndInAnother) {
  const Folder folder;
  auto journal = opened(folder);
  EXPECT_NE(refusal(folder.path()).find("process " + std::to_string(getpid()) + " writes this journal"),
            std::string::npos);
  const pid_t child = fork();
  ASSERT_GE(child, 0);
  if (child == 0) {
    std::string error;
    const bool refused =
        Journal::open(folder.path(), error) == nullptr && error.find("locked") != std::string::npos;
    _exit(refused ? 0 : 1);
  }
  int status = 0;
  ASSERT_EQ(waitpid(child, &status, 0), child);
  EXPECT_EQ(status, 0);
  std::string error;
  EXPECT_NE(Journal::open(folder.path(), error, "", true), nullptr) << "reading beside the writer: " << error;
  journal.reset();
  opened(folder);
}

TEST(Journal, TheLockDiesWithItsProcess) {
  const Folder folder;
  int ready[2] = {-1, -1};
  ASSERT_EQ(pipe(ready), 0);
  const pid_t child = fork();
  ASSERT_GE(child, 0);
  if (child == 0) {
    std::string error;
    const auto journal = Journal::open(folder.path(), error);
    SessionRow row;
    const bool ok = journal && journal->begin_session(row).ok;
    if (write(ready[1], ok ? "y" : "n", 1) != 1) _exit(1);
    pause();
    _exit(0);
  }
  char answer = 0;
  ASSERT_EQ(read(ready[0], &answer, 1), 1);
  ASSERT_EQ(answer, 'y');
  kill(child, SIGKILL);
  waitpid(child, nullptr, 0);
  EXPECT_EQ(opened(folder)->last_session()->session, 1U);
  close(ready[0]);
  close(ready[1]);
}

// Permissions do not bind root: the test becomes nobody for a while.
class AsNobody {
 public:
  AsNobody() : root_(geteuid() == 0) {
    if (root_) {
      EXPECT_EQ(seteuid(65534), 0);
    }
  }
  ~AsNobody() {
    if (root_) {
      EXPECT_EQ(seteuid(0), 0);
    }
  }
  AsNobody(const AsNobody&) = delete;
  AsNobody& operator=(const AsNobody&) = delete;

 private:
  bool root_;
};

TEST(Refusal, AFolderThatMayNotBeWritten) {
  const Folder folder;
  std::filesystem::permissions(folder.path(), std::filesystem::perms{0555});
  {
    const AsNobody nobody;
    EXPECT_NE(refusal(folder.path()).find("cannot be made"), std::string::npos);
  }
  std::filesystem::permissions(folder.path(), std::filesystem::perms{0755});
}

TEST(Journal, AReadOnlyFolderCanBeReadWithoutLeavingATrace) {
  const Folder folder;
  sound_bytes(folder);
  std::filesystem::permissions(folder.path(), std::filesystem::perms{0555});
  {
    const AsNobody nobody;
    std::string error;
    const auto journal = Journal::open(folder.path(), error, "", true);
    ASSERT_NE(journal, nullptr) << error;
    EXPECT_EQ(journal->finished(1).size(), 10U);
  }
  std::filesystem::permissions(folder.path(), std::filesystem::perms{0755});
  EXPECT_FALSE(std::filesystem::exists(folder.file() + "-shm"));
}

TEST(FullDisk, KeepsEveryFinishedWalkAndSaysSoInOneLine) {
  for (const std::int64_t room : {0, 1, 100, 4096, 10000, 33333, 100000, 250000}) {
    faults::FullDisk disk;
    const Folder folder;
    std::uint64_t finished = 0;
    std::string why;
    {
      std::string error;
      const auto journal = Journal::open(folder.path(), error, disk.vfs());
      ASSERT_NE(journal, nullptr) << error;
      begun(*journal);
      disk.leave(room);
      while (finished < 200 && journal->commit(episode(1, finished + 1), kParameters, "state", why))
        ++finished;
      ASSERT_LT(finished, 200U) << "the disk never filled up";
      EXPECT_NE(why.find("full"), std::string::npos) << why;
      EXPECT_NE(why.find("walk " + std::to_string(finished + 1)), std::string::npos) << why;
      EXPECT_EQ(why.find('\n'), std::string::npos) << why;
      EXPECT_EQ(journal->finished(1).size(), finished) << "still readable";

      disk.leave(-1);  // somebody makes room: what failed stays failed, with the first words
      std::string later;
      EXPECT_FALSE(journal->commit(episode(1, finished + 1), kParameters, "", later).has_value());
      EXPECT_EQ(later, why);
      EXPECT_EQ(journal->put("windings", "x").words, why);
      EXPECT_EQ(journal->failure(), why);
      disk.leave(0);
    }
    disk.leave(-1);
    const auto journal = opened(folder);
    EXPECT_EQ(journal->finished(1).size(), finished);
    walk(*journal, episode(1, finished + 1));
  }
}

TEST(FullDisk, NoRoomForANewJournalIsARefusal) {
  for (const std::int64_t room : {0, 50, 4096, 20000}) {
    faults::FullDisk disk;
    const Folder folder;
    disk.leave(room);
    EXPECT_NE(refusal(folder.path(), false, disk.vfs()).find("full"), std::string::npos) << room;
    opened(folder);  // with room again, what was left behind is no obstacle
  }
}

}  // namespace
}  // namespace pastern::journal
