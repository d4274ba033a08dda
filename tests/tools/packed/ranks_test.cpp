// Ranks of one mpirun, or alone: shares, gathering to the bit, agreement. The same tests run alone and under
// mpirun with 2 and 3 ranks; what each rank fills in, every rank must read.
#include "tools/packed/ranks.h"

#include <gtest/gtest.h>

#include <cmath>
#include <cstdlib>
#include <cstring>
#include <stdexcept>

namespace pastern::packed {
namespace {

const Ranks* the_ranks = nullptr;

double number(std::size_t row, std::size_t column) {
  if (row % 7 == 3 && column == 1) return -0.0;
  if (row % 11 == 5 && column == 0) return 1e-310;
  return std::sin(1.0 + static_cast<double>(row * 31 + column)) / 3;
}

TEST(Ranks, AreAsManyAsWereStarted) {
  const char* started = std::getenv("OMPI_COMM_WORLD_SIZE");
  EXPECT_EQ(the_ranks->count(), started == nullptr ? 1 : std::atoi(started));
  EXPECT_GE(the_ranks->rank(), 0);
  EXPECT_LT(the_ranks->rank(), the_ranks->count());
  EXPECT_EQ(the_ranks->leads(), the_ranks->rank() == 0);
}

// Owners in turn, in blocks, and all but one with nothing.
std::vector<int> owners(std::size_t rows, int how) {
  std::vector<int> made(rows, 0);
  const auto ranks = static_cast<std::size_t>(the_ranks->count());
  for (std::size_t row = 0; row < rows; ++row) {
    if (how == 0) made[row] = static_cast<int>(row % ranks);
    if (how == 1) made[row] = static_cast<int>(row * ranks / rows);
    if (how == 2) made[row] = the_ranks->count() - 1;
  }
  return made;
}

TEST(Ranks, EveryRankHasEveryRowToTheBitAfterwards) {
  for (int turn = 0; turn < 18; ++turn) {
    const std::size_t rows =
        std::vector<std::size_t>{0, 1, 2, 5, 128, 1001}[static_cast<std::size_t>(turn / 3)];
    constexpr std::size_t width = 3;
    std::vector<double> numbers(rows * width, -1);
    const std::vector<int> owner = owners(rows, turn % 3);
    for (std::size_t row = 0; row < rows; ++row) {
      if (owner[row] != the_ranks->rank()) continue;
      for (std::size_t c = 0; c < width; ++c) numbers[row * width + c] = number(row, c);
    }
    the_ranks->gather(owner, width, numbers.data());
    for (std::size_t row = 0; row < rows; ++row) {
      for (std::size_t c = 0; c < width; ++c) {
        const double expected = number(row, c);
        EXPECT_EQ(std::memcmp(&numbers[row * width + c], &expected, sizeof(double)), 0) << row << ' ' << c;
      }
    }
  }
}

TEST(Ranks, DifferentTextsAreNoticedByEveryRank) {
  const std::string own = "rank " + std::to_string(the_ranks->rank());
  const std::string longer = std::string(static_cast<std::size_t>(the_ranks->rank() + 1), 'x');
  EXPECT_TRUE(the_ranks->agree("the same robot"));
  EXPECT_TRUE(the_ranks->agree(""));
  EXPECT_EQ(the_ranks->agree(own), the_ranks->count() == 1);
  EXPECT_EQ(the_ranks->agree(longer), the_ranks->count() == 1);
}

TEST(Ranks, WhatIsSoOnOneRankIsToldToAll) {
  EXPECT_FALSE(the_ranks->any(false));
  EXPECT_TRUE(the_ranks->any(true));
  EXPECT_TRUE(the_ranks->any(the_ranks->rank() == the_ranks->count() - 1));
}

TEST(Ranks, TheNarrowestSetIsCommon) {
  const auto own = the_ranks->rank() == 0 ? InstructionSet::avx512 : InstructionSet::avx2;
  const auto common = the_ranks->count() == 1 ? InstructionSet::avx512 : InstructionSet::avx2;
  EXPECT_EQ(the_ranks->common_set(own), common);
}

}  // namespace
}  // namespace pastern::packed

int main(int argc, char** argv) {
  testing::InitGoogleTest(&argc, argv);
  std::string error;
  auto ranks = pastern::packed::Ranks::join(error);
  if (!ranks) {
    std::fprintf(stderr, "%s\n", error.c_str());
    return 70;
  }
  pastern::packed::the_ranks = ranks.get();
  // The last rank fails while the others wait for its results: all must end (see the test of that name).
  if (argc > 1 && std::string(argv[1]) == "fail") {
    try {
      const auto own = std::move(ranks);
      if (own->rank() == own->count() - 1) throw std::runtime_error("a walk could not be run");
      own->gather(std::vector<int>(100, 1), 1, std::vector<double>(100).data());
    } catch (const std::exception&) {
      return 70;
    }
  }
  return RUN_ALL_TESTS();
}
