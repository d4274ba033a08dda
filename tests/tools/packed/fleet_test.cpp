// The scores of many walks depend on nothing but each walk: not on threads, lanes, order, or what was walked
// before.
#include <gtest/gtest.h>

#include <algorithm>
#include <random>
#include <stdexcept>

#include "tests/tools/packed/fleet_fixture.h"

namespace pastern::packed {
namespace {

using test::Field;
using test::same;
using test::scores_of;

const Field& field() {
  static const Field made;
  return made;
}

Fleet fleet_of(unsigned threads, InstructionSet set = widest_set(), Numbers numbers = Numbers::single) {
  return Fleet(field().settings, tools::drawn_sites(tools::wide_ranges()), {threads, set, numbers});
}

void expect_all_same(const std::vector<tools::Score>& a, const std::vector<tools::Score>& b) {
  ASSERT_EQ(a.size(), b.size());
  for (std::size_t i = 0; i < a.size(); ++i) EXPECT_TRUE(same(a[i], b[i])) << i;
}

// 53 trials are no multiple of any number of lanes or threads.
TEST(Fleet, ScoresAreTheSameToTheBitForAnyNumberOfThreads) {
  const auto trials = field().trials(53);
  Fleet one = fleet_of(1);
  const auto scores = scores_of(one, trials);
  const auto fallen = std::count_if(scores.begin(), scores.end(), [](const auto& s) { return s.fell; });
  EXPECT_GT(fallen, 0) << "nothing was refilled";
  EXPECT_LT(fallen, 53);
  for (const unsigned threads : {2U, 3U, 5U}) {
    Fleet many = fleet_of(threads);
    expect_all_same(scores_of(many, trials), scores);
  }
}

TEST(Fleet, ScoresAreTheSameToTheBitInAnyOrderAndCompany) {
  for (const InstructionSet set : sets_here()) {
    const auto trials = field().trials(41);
    Fleet fleet = fleet_of(2, set);
    const auto scores = scores_of(fleet, trials);
    std::vector<std::size_t> order(trials.size());
    for (std::size_t i = 0; i < order.size(); ++i) order[i] = i;
    std::shuffle(order.begin(), order.end(), std::mt19937(5));
    std::vector<Trial> shuffled;
    for (const std::size_t i : order) shuffled.push_back(trials[i]);
    Fleet other = fleet_of(2, set);
    const auto again = scores_of(other, shuffled);
    for (std::size_t i = 0; i < order.size(); ++i)
      EXPECT_TRUE(same(again[i], scores[order[i]])) << name_of(set) << i;
    // Alone, and by robots that stood up in an earlier call.
    Fleet alone = fleet_of(1, set);
    for (const std::size_t i : {0U, 7U, 40U}) {
      expect_all_same(scores_of(alone, {trials[i]}), {scores[i]});
      expect_all_same(scores_of(fleet, {trials[i]}), {scores[i]});
    }
  }
}

// Some lose torque in the gear, some carry a load that swings, some walk over waves, some are as made.
TEST(Fleet, ScoresAreTheSameToTheBitInTheCompanyOfRobotsThatAreNotAsMade) {
  const tools::SiteChoice drawn = tools::drawn_sites(tools::wide_ranges());
  const tools::SiteChoice mixed = [&](const stub::Model& model, const tools::Lot& lot) {
    stub::Site site = drawn(model, lot);
    if (lot.number % 4 == 1) site.gear_loss.fill(0.1);
    if (lot.number % 4 == 2) site.load_hangs_m = 0.2;
    if (lot.number % 4 == 3) site.ground.wave_height_m = 0.01;
    if (lot.number % 4 == 3) site.ground.wave_length_m = 0.7;
    return site;
  };
  const auto trials = field().trials(41);
  Fleet fleet(field().settings, mixed, {2, widest_set(), Numbers::single});
  const auto scores = scores_of(fleet, trials);
  for (std::size_t i = 0; i < trials.size(); i += 3) {
    Fleet alone(field().settings, mixed, {1, widest_set(), Numbers::single});
    expect_all_same(scores_of(alone, {trials[i]}), {scores[i]});
  }
}

TEST(Fleet, DoubleLanesDoNotDependOnThreadsEither) {
  const auto trials = field().trials(21);
  Fleet one = fleet_of(1, widest_set(), Numbers::full);
  Fleet two = fleet_of(2, widest_set(), Numbers::full);
  expect_all_same(scores_of(two, trials), scores_of(one, trials));
}

TEST(Fleet, NothingToDoIsDone) {
  Fleet fleet = fleet_of(2);
  EXPECT_TRUE(scores_of(fleet, {}).empty());
}

TEST(Fleet, ASiteThatCannotBeChosenEndsTheCallAndNotTheFleet) {
  bool broken = true;
  const auto good = tools::drawn_sites(tools::wide_ranges());
  Fleet fleet(field().settings,
              [&](const stub::Model& model, const tools::Lot& lot) {
                if (broken && lot.number == 4) throw std::runtime_error("no such site");
                return good(model, lot);
              },
              {2, widest_set(), Numbers::single});
  const auto trials = field().trials(21);
  EXPECT_THROW(static_cast<void>(scores_of(fleet, trials)), std::runtime_error);
  broken = false;
  Fleet whole = fleet_of(1);
  expect_all_same(scores_of(fleet, trials), scores_of(whole, trials));
}

TEST(Fleet, ParametersOfAnotherPolicyAreRefused) {
  Fleet fleet = fleet_of(1);
  const Parameters few(3, 0.0);
  std::vector<Trial> trials = field().trials(2);
  trials[1].parameters = &few;
  try {
    static_cast<void>(scores_of(fleet, trials));
    FAIL() << "not refused";
  } catch (const std::invalid_argument& refused) {
    EXPECT_EQ(std::string(refused.what()).find("trial 1, parameters: 3, expected "), 0U) << refused.what();
  }
  std::vector<tools::Score> none;
  EXPECT_THROW(fleet.run(trials, none), std::invalid_argument);
}

}  // namespace
}  // namespace pastern::packed
