// Jobs over threads.
#include "tools/train/pool.h"

#include <gtest/gtest.h>

#include <atomic>
#include <stdexcept>
#include <vector>

namespace pastern::tools {
namespace {

TEST(Spread, DoesEachJobOnceOnAnyNumberOfThreads) {
  for (const unsigned threads : {0U, 1U, 2U, 7U}) {
    std::vector<std::atomic<int>> times(100);
    spread(threads, times.size(), [&](unsigned worker, std::size_t i) {
      EXPECT_LT(worker, std::max(1U, threads));
      times[i].fetch_add(1);
    });
    for (const auto& one : times) EXPECT_EQ(one.load(), 1);
  }
}

TEST(Spread, DoesNothingForNoJobs) {
  spread(4, 0, [](unsigned, std::size_t) { FAIL(); });
}

TEST(Spread, HandsAFailureBackAfterTheOthersHaveStopped) {
  std::atomic<int> running{0};
  EXPECT_THROW(spread(3, 1000,
                      [&](unsigned, std::size_t i) {
                        running.fetch_add(1);
                        if (i == 10) {
                          running.fetch_sub(1);
                          throw std::runtime_error("job");
                        }
                        running.fetch_sub(1);
                      }),
               std::runtime_error);
  EXPECT_EQ(running.load(), 0);
}

}  // namespace
}  // namespace pastern::tools
