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
            "p: search_walks: found 50, expected at least 52, the first batch of ES_GRADIENT\n");
}

TEST(PlanFile, ABatchOfTheOperatorsDefaultSizeMustFitToo) {
  const auto with = [](v1::Adaptation::Kind kind, std::uint32_t walks) {
    return why([kind, walks](v1::Plan& p) {
      p.mutable_adaptation()->clear_batch();
      if (kind != v1::Adaptation::ES_GRADIENT) p.mutable_adaptation()->clear_step();
      p.mutable_adaptation()->set_kind(kind);
      p.set_search_walks(walks);
    });
  };
  for (const auto& [kind, least] :
       {std::pair{v1::Adaptation::ES_GRADIENT, 10U}, std::pair{v1::Adaptation::BATCH_HILL_CLIMBING, 6U},
        std::pair{v1::Adaptation::AVERAGED_HILL_CLIMBING, 6U},
        std::pair{v1::Adaptation::SEQUENTIAL_HILL_CLIMBING, 2U}}) {
    EXPECT_EQ(with(kind, least), "accepted");
    EXPECT_EQ(with(kind, least - 1), "p: search_walks: found " + std::to_string(least - 1) +
                                         ", expected at least " + std::to_string(least) +
                                         ", the first batch of " + v1::Adaptation::Kind_Name(kind) + "\n");
  }
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

// (5 + 2 x 5 + 2 x 8) walks of 6 s: 3.1 minutes.
TEST(PlanFile, MinutesMustHoldBaselineABatchAndConfirmation) {
  const auto with = [](double minutes) {
    return why([minutes](v1::Plan& p) {
      p.set_walk_s(6);
      p.set_max_minutes(minutes);
    });
  };
  EXPECT_EQ(with(3),
            "p: max_minutes: found 3, expected at least 3.1: 31 walks of 6 s for baseline, first "
            "batch and confirmation\n");
  EXPECT_EQ(with(3.11), "accepted");
}

}  // namespace
}  // namespace pastern::files
