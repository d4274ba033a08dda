// The state machine on invented returns, each put on disk first: the journal alone can make what take()
// wants.
#include "runtime/session/session.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <map>

#include "proto/files/plan_file.h"
#include "runtime/adapt/confirm.h"
#include "runtime/journal/journal.h"
#include "tests/runtime/session/setting.h"

namespace pastern::session {
namespace {

using Earn = std::function<v1::Episode(const Order&)>;

SessionStart start_with(const v1::Plan& plan) {
  SessionStart start;
  start.plan = plan;
  start.start = {0.2, -0.1, 0.4, 0.3};
  start.groups = {{"all", 0, 4, 0.05}};
  return start;
}

v1::Episode walked(double total, v1::Outcome outcome = v1::COMPLETED) {
  v1::Episode episode;
  episode.set_outcome(outcome);
  episode.mutable_terms()->set_forward(total);
  episode.mutable_summary()->set_duration_s(5);
  return episode;
}

// A slope upward in every direction: the search finds something better.
double slope(const Parameters& parameters) {
  double sum = 1;
  for (const double parameter : parameters) sum += parameter;
  return sum;
}

class Record {
 public:
  explicit Record(const SessionStart& start) : start_(start) { open(); }

  void open() {
    std::string error;
    journal_ = journal::Journal::open(folder_.path(), error);
    ASSERT_TRUE(journal_) << error;
    journal::SessionRow row;
    ASSERT_TRUE(journal_->begin_session(row).ok);
    number_ = row.session;
  }

  /// Walks until the end or `walks`, telling the session each result once it is on disk.
  void walk(Session& session, const Earn& earn, std::uint64_t walks = 10000) {
    while (session.next() && session.walks_done() < walks) {
      const Order order = *session.next();
      orders_.push_back(order);
      v1::Episode episode = earn(order);
      episode.set_session(number_);
      episode.set_walk(order.walk);
      episode.set_part(static_cast<v1::Part>(static_cast<int>(order.part)));
      episode.set_batch(order.batch);
      episode.set_index(order.index);
      episode.set_draw(order.draw);
      episode.set_started_s(10.0 * static_cast<double>(order.walk - 1));
      std::string why;
      const auto proof = journal_->commit(episode, order.parameters, "", why);
      ASSERT_TRUE(proof) << why;
      ASSERT_TRUE(session.take(*proof, episode.started_s() + 5));
    }
  }

  [[nodiscard]] std::vector<journal::Journal::Finished> finished() const {
    return journal_->finished(number_);
  }
  [[nodiscard]] const std::vector<Order>& orders() const { return orders_; }

  [[nodiscard]] int count(Part part) const {
    int count = 0;
    for (const Order& order : orders_) count += order.part == part ? 1 : 0;
    return count;
  }

 private:
  test::TestFolder folder_;
  SessionStart start_;
  std::unique_ptr<journal::Journal> journal_;
  std::uint64_t number_{0};
  std::vector<Order> orders_;
};

Earn on_the_slope() {
  return [](const Order& order) {
    return walked(slope(order.parameters) + 0.01 * std::sin(static_cast<double>(order.walk)));
  };
}

void expect_same_order(const std::optional<Order>& found, const std::optional<Order>& expected) {
  ASSERT_EQ(found.has_value(), expected.has_value());
  if (!found) return;
  EXPECT_EQ(found->walk, expected->walk);
  EXPECT_EQ(found->part, expected->part);
  EXPECT_EQ(found->batch, expected->batch);
  EXPECT_EQ(found->index, expected->index);
  EXPECT_EQ(found->draw, expected->draw);
  EXPECT_EQ(found->parameters, expected->parameters);
}

class SessionOfKind : public testing::TestWithParam<v1::Adaptation::Kind> {};

TEST_P(SessionOfKind, WalksBaselineSearchAndConfirmationAndAdoptsWhatIsBetter) {
  v1::Plan plan = test::short_plan(GetParam());
  plan.set_search_walks(24);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  EXPECT_EQ(session.part(), v1::IN_BASELINE);
  record.walk(session, on_the_slope());
  ASSERT_TRUE(session.verdict());
  EXPECT_EQ(session.part(), v1::ENDED);
  EXPECT_EQ(record.count(Part::baseline), 2);
  EXPECT_LE(record.count(Part::search), 24);
  EXPECT_GT(record.count(Part::search), 20);
  EXPECT_EQ(record.count(Part::confirmation_start), 5);
  EXPECT_EQ(record.count(Part::confirmation_adapted), 5);
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::ADOPT) << session.verdict()->words();
  EXPECT_EQ(session.verdict()->pairs(), 5U);
  EXPECT_DOUBLE_EQ(session.verdict()->p_value(), 1.0 / 32);  // all five pairs better: 1 of 2^5 sign patterns
  EXPECT_GT(session.verdict()->effect_low(), 0);
  EXPECT_NE(session.adapted(), start.start);
  EXPECT_EQ(session.walks_done(), record.orders().size());
}

TEST_P(SessionOfKind, ToldTheRecordAfterAnyWalkItOrdersTheSameNext) {
  const SessionStart start = start_with(test::short_plan(GetParam()));
  Session session(start);
  Record record(start);
  int walk = 0;
  const Earn earn = [&walk](const Order& order) {
    ++walk;
    if (walk % 4 == 0) return walked(0, v1::VOID);
    return walked(slope(order.parameters), walk % 7 == 0 ? v1::FELL : v1::COMPLETED);
  };
  while (session.next()) {
    record.walk(session, earn, session.walks_done() + 1);
    Session again(start);
    for (const auto& finished : record.finished()) {
      ASSERT_TRUE(again.take(finished.evaluation, finished.episode.started_s() + 5));
    }
    expect_same_order(again.next(), session.next());
    EXPECT_EQ(again.falls(), session.falls());
    EXPECT_EQ(again.voids(), session.voids());
    ASSERT_EQ(again.verdict().has_value(), session.verdict().has_value());
    if (session.verdict()) {
      EXPECT_EQ(again.verdict()->SerializeAsString(), session.verdict()->SerializeAsString());
    }
  }
  EXPECT_GT(session.voids(), 0U);
}

INSTANTIATE_TEST_SUITE_P(Kinds, SessionOfKind,
                         testing::Values(v1::Adaptation::SEQUENTIAL_HILL_CLIMBING,
                                         v1::Adaptation::AVERAGED_HILL_CLIMBING,
                                         v1::Adaptation::BATCH_HILL_CLIMBING, v1::Adaptation::ES_GRADIENT));

TEST(Session, KeepsWhenTheAdaptedPolicyIsNoBetter) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    const bool search = order.part == Part::search;
    const double flat = 1 + 0.1 * std::sin(13.0 * static_cast<double>(order.walk));
    return walked(search ? slope(order.parameters) : flat);
  });
  ASSERT_TRUE(session.verdict());
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
  EXPECT_EQ(session.verdict()->pairs(), 5U);
  EXPECT_GT(session.verdict()->p_value(), 0.05);
}

TEST(Session, KeepsWhenTheAdaptedPolicyIsWorseHoweverClear) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    if (order.part == Part::search) return walked(slope(order.parameters));
    return walked(order.part == Part::confirmation_adapted ? 0.5 : 1.0);
  });
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
  EXPECT_LT(session.verdict()->effect_high(), 0);
}

TEST(Session, OrderWithinAPairIsTheRandomOneOfTheSeed) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  int seen = 0;
  for (const Order& order : record.orders()) {
    const bool adapted = order.part == Part::confirmation_adapted;
    if (order.index != 0 || (!adapted && order.part != Part::confirmation_start)) continue;
    EXPECT_EQ(adapted, adapt::adapted_walks_first(7, order.batch));
    ++seen;
  }
  EXPECT_EQ(seen, 5);
}

TEST(Session, EveryWalkHasADrawOfItsOwn) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  std::map<std::uint64_t, int> draws;
  for (const Order& order : record.orders()) ++draws[order.draw];
  EXPECT_EQ(draws.size(), record.orders().size());
}

TEST(Session, AVoidWalkIsWalkedAgainWithANewDrawAndNeverCounts) {
  const SessionStart start = start_with(test::short_plan());
  Session clean(start);
  Session session(start);
  Record clean_record(start);
  Record record(start);
  clean_record.walk(clean, [](const Order& order) { return walked(slope(order.parameters)); });
  int asked = 0;
  record.walk(session, [&asked](const Order& order) {
    return ++asked % 3 == 0 ? walked(-1e9, v1::VOID) : walked(slope(order.parameters));
  });
  EXPECT_GT(session.voids(), 3U);
  EXPECT_EQ(session.adapted(), clean.adapted());
  EXPECT_EQ(session.verdict()->effect(), clean.verdict()->effect());
  EXPECT_EQ(session.start_return(), clean.start_return());
}

TEST(Session, TooManyVoidsOfTheSameWalkEndItInWords) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    return order.walk > 3 ? walked(0, v1::VOID) : walked(slope(order.parameters));
  });
  ASSERT_TRUE(session.verdict());
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
  EXPECT_EQ(session.walks_done(), 3U + 4U);  // max_void_repeats is 3
  EXPECT_NE(session.verdict()->words().find("void 4 times"), std::string::npos) << session.verdict()->words();
}

TEST(Session, VoidsThatAPersonStoppedDoNotCountAgainstTheRepeats) {
  for (const char* cause : {"operator_stop", "operator_halt", "emergency_stop"}) {
    const SessionStart start = start_with(test::short_plan());
    Session session(start);
    Record record(start);
    record.walk(session, [cause](const Order& order) {
      v1::Episode episode = order.walk <= 6 ? walked(0, v1::VOID) : walked(slope(order.parameters));
      if (order.walk <= 6) episode.mutable_trip()->set_cause(cause);
      return episode;
    });
    EXPECT_EQ(session.voids(), 6U) << cause;  // max_void_repeats is 3
    EXPECT_EQ(session.verdict()->words().find("void"), std::string::npos) << session.verdict()->words();
    // A session resumed from the record is told the same.
    Session again(start);
    for (const auto& walk : record.finished()) ASSERT_TRUE(again.next() && again.take(walk.evaluation, 0));
    EXPECT_FALSE(again.next());
    EXPECT_EQ(again.voids(), 6U);
  }
}

// Others of the same walk still count, before and after.
TEST(Session, AStopByAPersonDoesNotWashOtherVoidsAway) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    v1::Episode episode = walked(0, v1::VOID);
    episode.mutable_trip()->set_cause(order.walk % 2 == 0 ? "operator_stop" : "frame_stale");
    return episode;
  });
  ASSERT_TRUE(session.verdict());
  EXPECT_EQ(session.walks_done(), 7U);  // the fourth that is not a person's
  EXPECT_NE(session.verdict()->words().find("void 4 times"), std::string::npos) << session.verdict()->words();
}

TEST(Session, FallsEndTheSearchAndAnImprovedPolicyIsConfirmed) {
  v1::Plan plan = test::short_plan(v1::Adaptation::BATCH_HILL_CLIMBING);
  plan.set_search_walks(40);
  plan.set_max_falls(2);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    const bool falls = order.part == Part::search && order.walk > 12 && order.walk % 3 == 0;
    return falls ? walked(-1, v1::FELL) : walked(slope(order.parameters));
  });
  EXPECT_EQ(session.falls(), 2U);
  EXPECT_LT(record.count(Part::search), 40);
  EXPECT_EQ(record.count(Part::confirmation_adapted), 5);
  EXPECT_NE(session.verdict()->words().find("at 2 falls"), std::string::npos) << session.verdict()->words();
}

TEST(Session, FallsWithoutImprovementEndInKeepWithoutConfirmation) {
  v1::Plan plan = test::short_plan();
  plan.set_max_falls(2);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    return order.part == Part::search ? walked(-1, v1::FELL) : walked(slope(order.parameters));
  });
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
  EXPECT_EQ(record.count(Part::search), 2);
  EXPECT_EQ(record.count(Part::confirmation_start), 0);
}

TEST(Session, FallsInTheBaselineEndIt) {
  v1::Plan plan = test::short_plan();
  plan.set_baseline_walks(6);
  plan.set_max_falls(3);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order&) { return walked(-1, v1::FELL); });
  EXPECT_EQ(session.walks_done(), 3U);
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
}

TEST(Session, FallsWithinTheConfirmationEndItAsKeep) {
  v1::Plan plan = test::short_plan();
  plan.set_max_falls(2);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, [](const Order& order) {
    return order.part == Part::confirmation_adapted ? walked(-1, v1::FELL) : walked(slope(order.parameters));
  });
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
  EXPECT_EQ(record.count(Part::confirmation_adapted), 2);
}

// Each pair tells the same small difference: the interval excludes 0 from the first to the last one.
TEST(Session, AnEffectThatIsRealButTinyIsToldAsOfNoPracticalSizeAndTheRuleStays) {
  for (const double gain : {0.03, -0.03, 0.06}) {
    const SessionStart start = start_with(test::short_plan());
    Session session(start);
    Record record(start);
    record.walk(session, [gain](const Order& order) {
      return walked(order.part == Part::search                 ? slope(order.parameters)
                    : order.part == Part::confirmation_adapted ? 2 + gain
                                                               : 2);
    });
    const v1::Verdict verdict = *session.verdict();
    EXPECT_EQ(verdict.kind(), gain > 0 ? v1::Verdict::ADOPT : v1::Verdict::KEEP) << verdict.words();
    EXPECT_EQ(verdict.words().find("real, but of no practical size") != std::string::npos,
              std::abs(gain) < kPracticalSize)
        << verdict.words();
  }
  EXPECT_FALSE(of_no_practical_size(0.03, -0.01, 0.07)) << "not shown to be real";
  EXPECT_FALSE(of_no_practical_size(std::nan(""), std::nan(""), std::nan("")));
}

// What `pastern check` expects of a plan is what the operators really ask for.
TEST(Session, TheFirstBatchIsAsLongAsThePlanFileSays) {
  for (const auto kind : {v1::Adaptation::SEQUENTIAL_HILL_CLIMBING, v1::Adaptation::AVERAGED_HILL_CLIMBING,
                          v1::Adaptation::BATCH_HILL_CLIMBING, v1::Adaptation::ES_GRADIENT}) {
    for (const bool said : {false, true}) {
      v1::Plan plan = test::short_plan(kind);
      plan.mutable_adaptation()->clear_batch();
      plan.mutable_adaptation()->clear_repeats();
      if (said && kind == v1::Adaptation::AVERAGED_HILL_CLIMBING) plan.mutable_adaptation()->set_repeats(4);
      if (said && kind == v1::Adaptation::BATCH_HILL_CLIMBING) plan.mutable_adaptation()->set_batch(7);
      if (said && kind == v1::Adaptation::ES_GRADIENT) plan.mutable_adaptation()->set_batch(7);
      const std::uint32_t least = files::first_batch_walks(plan);
      for (const std::uint32_t walks : {least, least - 1}) {
        plan.set_search_walks(walks);
        const SessionStart start = start_with(plan);
        Session session(start);
        Record record(start);
        record.walk(session, on_the_slope());
        EXPECT_EQ(record.count(Part::search), walks == least ? static_cast<int>(least) : 0)
            << v1::Adaptation::Kind_Name(kind);
      }
    }
  }
}

TEST(Session, AClearlyWorsePolicyIsCalledWorseAndAnUnclearOneIsNot) {
  for (const bool clear : {true, false}) {
    const SessionStart start = start_with(test::short_plan());
    Session session(start);
    Record record(start);
    record.walk(session, [clear](const Order& order) {
      const double aside = clear || order.batch > 0 ? -0.5 : 0.5;  // the first pair speaks for it
      return walked(order.part == Part::search                 ? slope(order.parameters)
                    : order.part == Part::confirmation_adapted ? 2 + aside
                                                               : 2);
    });
    const std::string words = session.verdict()->words();
    EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
    EXPECT_EQ(session.verdict()->effect_high() < 0, clear) << words;
    EXPECT_EQ(words.find("the adapted policy walks worse") != std::string::npos, clear) << words;
    EXPECT_EQ(words.find("not told apart from chance") != std::string::npos, !clear) << words;
  }
}

TEST(Session, MinutesLeaveRoomForTheConfirmation) {
  v1::Plan plan = test::short_plan();
  plan.set_search_walks(400);
  plan.set_max_minutes(4);  // 24 walks of 10 s
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  EXPECT_EQ(session.verdict()->pairs(), 5U) << session.verdict()->words();
  EXPECT_LE(session.walks_done(), 25U);
  EXPECT_GE(session.walks_done(), 20U);
  EXPECT_NE(session.verdict()->words().find("leave time"), std::string::npos) << session.verdict()->words();
}

TEST(Session, AnEmptySearchIsNotCalledAFruitlessOne) {
  v1::Plan plan = test::short_plan(v1::Adaptation::ES_GRADIENT);
  plan.set_search_walks(4);
  plan.mutable_adaptation()->set_batch(3);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  ASSERT_TRUE(session.verdict());
  EXPECT_NE(session.verdict()->words().find("nothing was searched: a batch of 6 walks"), std::string::npos)
      << session.verdict()->words();
}

TEST(Session, ABatchThatDoesNotFitIsNotBegun) {
  v1::Plan plan = test::short_plan(v1::Adaptation::ES_GRADIENT);
  plan.set_search_walks(10);
  plan.mutable_adaptation()->set_batch(3);  // three antithetic pairs: 6 walks
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  EXPECT_EQ(record.count(Part::search), 6);
}

TEST(Session, WithoutSearchWalksThereIsNothingToConfirm) {
  v1::Plan plan = test::short_plan();
  plan.set_search_walks(0);
  const SessionStart start = start_with(plan);
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  EXPECT_EQ(session.walks_done(), 2U);
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::KEEP);
}

TEST(Session, AnOfferedCandidateGoesStraightToConfirmation) {
  SessionStart start = start_with(test::short_plan(v1::Adaptation::OFFERED_CANDIDATE));
  EXPECT_NE(refusal(start), "");
  start.candidate = start.start;
  (*start.candidate)[0] += 0.1;
  ASSERT_EQ(refusal(start), "");
  Session session(start);
  Record record(start);
  record.walk(session, on_the_slope());
  EXPECT_EQ(record.count(Part::search), 0);
  EXPECT_EQ(session.walks_done(), 12U);
  EXPECT_EQ(session.walks_planned(), 12U);
  EXPECT_EQ(session.adapted(), *start.candidate);
  EXPECT_EQ(session.verdict()->kind(), v1::Verdict::ADOPT);
}

TEST(Session, RefusesCandidatesThatDoNotFit) {
  SessionStart start = start_with(test::short_plan(v1::Adaptation::OFFERED_CANDIDATE));
  start.candidate = Parameters{1, 2};
  EXPECT_NE(refusal(start).find("found 2 parameters, expected 4"), std::string::npos) << refusal(start);
  start.candidate = start.start;
  (*start.candidate)[2] = std::nan("");
  EXPECT_NE(refusal(start).find("trust region"), std::string::npos) << refusal(start);
  (*start.candidate)[2] = 100;
  EXPECT_NE(refusal(start).find("trust region"), std::string::npos);
  SessionStart search = start_with(test::short_plan());
  EXPECT_EQ(refusal(search), "");
  search.candidate = search.start;
  EXPECT_NE(refusal(search), "");
}

TEST(Session, RefusesAResultThatItDidNotAskFor) {
  const SessionStart start = start_with(test::short_plan());
  Session session(start);
  Session other(start);
  Record record(start);
  record.walk(other, on_the_slope(), 2);
  const auto finished = record.finished();
  EXPECT_FALSE(session.take(finished[1].evaluation, 1));
  EXPECT_EQ(session.walks_done(), 0U);
  EXPECT_TRUE(session.take(finished[0].evaluation, 1));
  EXPECT_FALSE(session.take(finished[0].evaluation, 2));
}

}  // namespace
}  // namespace pastern::session
