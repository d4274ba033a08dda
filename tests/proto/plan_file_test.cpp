// Plans that could not end, or not end in an adoption, are refused.
#include "proto/files/plan_file.h"

#include <gtest/gtest.h>

#include <functional>

#include "tests/proto/fixture.h"

namespace pastern::files {
namespace {

std::string why(const std::function<void(v1::Plan&)>& change) {
  v1::Plan plan = fixture::plan();
  change(plan);
  Defects defects;
  return parse_plan(fixture::text(plan), "p", defects) ? "accepted" : lines(defects);
}

TEST(PlanFile, SettingsOfAnotherOperatorAreRefused) {
  EXPECT_EQ(why([](v1::Plan& p) { p.mutable_adaptation()->set_repeats(3); }),
            "p: adaptation.repeats: found a number, expected nothing: ES_GRADIENT has no repeats\n");
  EXPECT_EQ(why([](v1::Plan& p) { p.mutable_adaptation()->set_kind(v1::Adaptation::BATCH_HILL_CLIMBING); }),
            "p: adaptation.step: found a number, expected nothing: BATCH_HILL_CLIMBING has no step\n");
  EXPECT_EQ(why([](v1::Plan& p) {
              p.mutable_adaptation()->set_kind(v1::Adaptation::AVERAGED_HILL_CLIMBING);
              p.mutable_adaptation()->clear_step();
              p.mutable_adaptation()->set_repeats(3);
            }),
            "accepted");
}

TEST(PlanFile, ASearchHasWalksAndAnOfferedCandidateHasNone) {
  EXPECT_NE(
      why([](v1::Plan& p) { p.set_search_walks(0); }).find("p: search_walks: found 0, expected at least 1"),
      std::string::npos);
  EXPECT_EQ(why([](v1::Plan& p) {
              p.mutable_adaptation()->set_kind(v1::Adaptation::OFFERED_CANDIDATE);
              p.mutable_adaptation()->clear_step();
            }),
            "p: search_walks: found 50, expected 0: OFFERED_CANDIDATE does not search\n");
}

TEST(PlanFile, ABatchMustFitIntoTheSearch) {
  EXPECT_EQ(why([](v1::Plan& p) { p.mutable_adaptation()->set_batch(25); }), "accepted");
  EXPECT_EQ(why([](v1::Plan& p) { p.mutable_adaptation()->set_batch(26); }),
            "p: adaptation.batch: found 26, expected a batch that fits into search_walks, 50 (a pair is two "
            "walks)\n");
}

// 2^-5 = 0.03125 is the least p of an exact one-sided sign-flip test over five pairs.
TEST(PlanFile, ALevelThatTheTestCannotReachIsRefused) {
  const auto with = [](double level) {
    return why([level](v1::Plan& p) {
      p.set_confirmation_pairs(5);
      p.set_confirmation_level(level);
    });
  };
  EXPECT_EQ(with(0.03125), "accepted");
  EXPECT_EQ(with(0.03124),
            "p: confirmation_level: found 0.03124, expected at least 0.03125, the least p that 5 pairs can "
            "give\n");
}

TEST(PlanFile, MinutesMustHoldBaselineAndConfirmation) {
  EXPECT_EQ(why([](v1::Plan& p) { p.set_max_minutes(1.7); }),
            "p: max_minutes: found 1.7, expected time for baseline and confirmation alone, 1.75 (min)\n");
  EXPECT_EQ(why([](v1::Plan& p) { p.set_max_minutes(1.75); }), "accepted");
}

}  // namespace
}  // namespace pastern::files
