// kill -9 of the real onboard program at random times during sessions over the link (the long form is a
// bench).
#include <gtest/gtest.h>

#include "tests/faults/killed_session.h"

namespace pastern::faults {
namespace {

TEST(Kills, LoseNoFinishedWalkAndChangeNoResult) {
  constexpr std::uint64_t kKills = 30;
  KillTally tally;
  ASSERT_TRUE(kill_many(shipped_files(PASTERN_SOURCE_DIR, PASTERN_BINARY_DIR, "dunlin12", "cold_store"),
                        kKills, 11, tally));
  EXPECT_GE(tally.walks, 24U);  // voids come on top
  EXPECT_EQ(tally.sum.kills, kKills);
  EXPECT_GE(tally.sum.during_walks, kKills / 2)
      << "most kills must fall between walks, or the test shows little";
  EXPECT_EQ(tally.sum.walks_lost, 0U);
  EXPECT_EQ(tally.sum.unreadable, 0U);
  EXPECT_EQ(tally.different, 0U);
}

}  // namespace
}  // namespace pastern::faults
