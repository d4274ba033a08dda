// The trainer on a course whose optimum is known.
#include "tools/train/trainer.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "tools/train/draws.h"

namespace pastern::tools {
namespace {

// -|x - target|^2 with noise of the lot, and a share of lots that cost 100: returns without a lower bound.
class Hill final : public Course {
 public:
  explicit Hill(Parameters target) : target_(std::move(target)) {}
  Score run(const Parameters& x, const Lot& lot) override {
    Draws draws(lot.seed, Purpose::walk, lot.number);
    double total = 0.1 * draws.normal();
    for (std::size_t j = 0; j < x.size(); ++j) total -= (x[j] - target_[j]) * (x[j] - target_[j]);
    Score score;
    score.fell = draws.uniform() < 0.05;
    score.terms.forward = total;
    score.terms.fall = score.fell ? -100 : 0;
    score.distance_m = 2;
    return score;
  }
  std::unique_ptr<Course> another() const override { return std::make_unique<Hill>(target_); }
  double duration_s() const override { return 4; }

 private:
  Parameters target_;
};

const Parameters kTarget{0.5, -0.3, 0.2, 0.1};

TrainerSettings small() {
  TrainerSettings settings;
  settings.iterations = 60;
  settings.directions = 16;
  settings.step = 0.03;
  settings.last_step = 0.005;
  settings.look_walks = 50;
  return settings;
}

Trainer trainer(const TrainerSettings& settings, unsigned threads) {
  return {settings, Parameters(4, 0.0), courses_for(std::make_unique<Hill>(kTarget), threads)};
}

void finish(Trainer& one) {
  while (one.step()) {
  }
}

double distance(const Parameters& x) {
  double square = 0;
  for (std::size_t j = 0; j < x.size(); ++j) square += (x[j] - kTarget[j]) * (x[j] - kTarget[j]);
  return std::sqrt(square);
}

TEST(Trainer, FindsAKnownOptimum) {
  Trainer one = trainer(small(), 1);
  EXPECT_NEAR(distance(one.best()), 0.6245, 1e-4);
  finish(one);
  EXPECT_LT(distance(one.best()), 0.05);
  EXPECT_EQ(one.walks(), 60U * 32U + 6U * 50U);
  EXPECT_EQ(one.looks().size(), 6U);
  EXPECT_DOUBLE_EQ(one.looks()[0].speed_m_per_s(), 0.5);
}

TEST(Trainer, GivesTheSameBitsOnAnyNumberOfThreads) {
  Trainer one = trainer(small(), 1);
  Trainer three = trainer(small(), 3);
  finish(one);
  finish(three);
  EXPECT_EQ(one.centre(), three.centre());
  EXPECT_EQ(one.best(), three.best());
  v1::Training a;
  v1::Training b;
  one.save(a);
  three.save(b);
  EXPECT_EQ(a.SerializeAsString(), b.SerializeAsString());
}

TEST(Trainer, AnotherSeedGivesAnotherResult) {
  TrainerSettings other = small();
  other.seed = 2;
  Trainer one = trainer(small(), 1);
  Trainer two = trainer(other, 1);
  finish(one);
  finish(two);
  EXPECT_NE(one.centre(), two.centre());
}

TEST(Trainer, GoesOnAfterAnyIterationAsIfNeverInterrupted) {
  Trainer whole = trainer(small(), 2);
  finish(whole);
  v1::Training expected;
  whole.save(expected);
  for (const int stop : {0, 1, 9, 10, 37, 60}) {
    Trainer first = trainer(small(), 1);
    for (int i = 0; i < stop; ++i) first.step();
    v1::Training saved;
    first.save(saved);
    Trainer second = trainer(small(), 2);
    std::string error;
    ASSERT_TRUE(second.restore(saved, error)) << error;
    finish(second);
    v1::Training result;
    second.save(result);
    EXPECT_EQ(result.SerializeAsString(), expected.SerializeAsString()) << stop;
  }
}

TEST(Trainer, KeepsTheBestLookWhenLaterOnesAreWorse) {
  TrainerSettings wild = small();
  wild.step = 0.02;
  wild.last_step = 5;  // throws the centre away towards the end
  Trainer one = trainer(wild, 1);
  finish(one);
  EXPECT_GT(distance(one.centre()), 1);
  EXPECT_LT(distance(one.best()), 0.7);
  double best = -std::numeric_limits<double>::infinity();
  for (const auto& look : one.looks()) best = std::max(best, look.mean_return());
  EXPECT_EQ(one.best_score(), best);
}

TEST(Trainer, RefusesAStateThatIsNotItsOwn) {
  Trainer first = trainer(small(), 1);
  first.step();
  v1::Training saved;
  first.save(saved);
  const auto why = [](const v1::Training& training) {
    Trainer one = trainer(small(), 1);
    std::string error;
    return one.restore(training, error) ? "accepted" : error;
  };
  EXPECT_EQ(why(saved), "accepted");
  v1::Training bad = saved;
  bad.set_format(2);
  EXPECT_EQ(why(bad), "found format 2, expected format 1");
  bad = saved;
  bad.set_settings("other");
  EXPECT_NE(why(bad).find("found a training with other, expected seed 1"), std::string::npos);
  bad = saved;
  bad.add_centre(1);
  EXPECT_NE(why(bad).find("found 5 parameters, expected 4"), std::string::npos);
  bad = saved;
  bad.clear_mean();
  EXPECT_NE(why(bad), "accepted");
  bad = saved;
  bad.set_square(2, std::numeric_limits<double>::quiet_NaN());
  EXPECT_NE(why(bad).find("not finite"), std::string::npos);
  bad = saved;
  bad.set_iteration(61);
  EXPECT_NE(why(bad).find("found iteration 61"), std::string::npos);
}

TEST(Look, CountsMeansAndStandardError) {
  const auto courses = courses_for(std::make_unique<Hill>(kTarget), 2);
  const Look look = look_at(courses, kTarget, 3, 10, 400);
  double mean = 0;
  double falls = 0;
  for (std::uint64_t i = 10; i < 410; ++i) {
    const Score score = courses.front()->run(kTarget, {3, i});
    mean += score.terms.total() / 400;
    falls += score.fell ? 1 : 0;
  }
  EXPECT_NEAR(look.mean_return, mean, 1e-9);
  EXPECT_NEAR(look.falls, falls / 400, 1e-12);
  // A share p of falls at -100 dominates: sd = 100 sqrt(p (1 - p)), standard error sd / 20.
  EXPECT_NEAR(look.return_error, 100 * std::sqrt(falls / 400 * (1 - falls / 400)) / 20, 0.02);
}

}  // namespace
}  // namespace pastern::tools
