// The power goes at every sync of a session of twelve walks: nothing that was acknowledged is missing
// afterwards, and the continued session ends like one never interrupted.
#include <gtest/gtest.h>
#include <sqlite3.h>

#include <filesystem>

#include "tests/faults/power_cut_vfs.h"
#include "tests/faults/twelve_walks.h"

namespace pastern::faults {
namespace {

std::string fresh_folder(const std::string& name) {
  const std::string folder = testing::TempDir() + "pastern_" + name;
  std::filesystem::remove_all(folder);
  std::filesystem::create_directory(folder);
  return folder;
}

TEST(PowerCut, LosesNothingAtAnySyncOfASessionHoweverTheWritesAreTorn) {
  PowerCutTrial trial(fresh_folder("power_cut"));
  EXPECT_GT(trial.syncs(), 60U);  // 12 walks, five transactions each
  for (std::uint64_t n = 1; n <= trial.syncs(); ++n) {
    for (unsigned tear = 0; tear < 3; ++tear) {
      const CutResult result = trial.cut(n, tear, 1000 * n + tear);
      EXPECT_TRUE(result.cut) << "sync " << n;
      EXPECT_FALSE(result.unreadable) << "sync " << n << " tear " << tear << ": " << result.lost;
      EXPECT_EQ(result.lost, "") << "sync " << n << " tear " << tear;
      EXPECT_FALSE(result.other_result) << "sync " << n << " tear " << tear;
    }
  }
  EXPECT_FALSE(trial.cut(trial.syncs() + 1, 0, 1).cut) << "every sync was tried";
}

// Shows that the disk tears: a journal whose commits are not synced does lose walks on it.
TEST(PowerCut, TheDiskReallyDropsWhatWasNotSynced) {
  PowerCutDisk disk;
  const std::string folder = fresh_folder("power_cut_unsynced");
  sqlite3* raw = nullptr;
  ASSERT_EQ(sqlite3_open_v2((folder + "/x").c_str(), &raw, SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE,
                            disk.vfs().c_str()),
            SQLITE_OK);
  ASSERT_EQ(sqlite3_exec(raw, "PRAGMA journal_mode = WAL; PRAGMA synchronous = FULL; CREATE TABLE t (x);",
                         nullptr, nullptr, nullptr),
            SQLITE_OK);
  ASSERT_EQ(
      sqlite3_exec(raw, "PRAGMA synchronous = OFF; INSERT INTO t VALUES (1);", nullptr, nullptr, nullptr),
      SQLITE_OK);
  disk.cut_at_sync(1);
  sqlite3_exec(raw, "PRAGMA synchronous = FULL; INSERT INTO t VALUES (2);", nullptr, nullptr, nullptr);
  EXPECT_TRUE(disk.dead());
  sqlite3_close(raw);
  disk.power_on(Tear::drop, 1);
  ASSERT_EQ(sqlite3_open_v2((folder + "/x").c_str(), &raw, SQLITE_OPEN_READWRITE, disk.vfs().c_str()),
            SQLITE_OK);
  sqlite3_stmt* count = nullptr;
  ASSERT_EQ(sqlite3_prepare_v2(raw, "SELECT count(*) FROM t", -1, &count, nullptr), SQLITE_OK);
  ASSERT_EQ(sqlite3_step(count), SQLITE_ROW);
  EXPECT_EQ(sqlite3_column_int(count, 0), 0);
  sqlite3_finalize(count);
  sqlite3_close(raw);
}

}  // namespace
}  // namespace pastern::faults
