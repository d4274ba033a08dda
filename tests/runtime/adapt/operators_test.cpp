// What every adaptation operator owes: replay, order within a batch, voids, returns that are no numbers, the
// trust region, bad settings.
#include <gtest/gtest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <stdexcept>

#include "runtime/adapt/operator.h"
#include "runtime/adapt/random.h"
#include "tests/runtime/adapt/on_disk.h"

namespace pastern::adapt {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInfinity = std::numeric_limits<double>::infinity();

const Parameters kStart{1.0, -2.0, 0.5, 3.0, -1.0, 0.25};

Settings grouped(Kind kind, std::uint64_t seed) {
  Settings settings = settings_of(kind, kStart.size(), 0.1, seed);
  settings.groups = {{"gait", 0, 2, 0.3},
                     {"feedback", 2, 3, 0.05}};  // the last parameter belongs to no group
  settings.trust_region = 0.5;
  return settings;
}

double bumpy(const Proposal& proposal, std::uint32_t number) {
  double value = 0.3 * random_normal(1, Stream::test, number, 0);
  for (const double x : proposal.parameters) value += std::sin(3 * x);
  return value;
}

double norm_of_change(const Parameters& a, const Parameters& b, const Group& group) {
  double sum = 0;
  for (std::size_t i = group.first; i < group.first + group.count; ++i) sum += (a[i] - b[i]) * (a[i] - b[i]);
  return std::sqrt(sum);
}

double norm_of(const Parameters& a, const Group& group) {
  return norm_of_change(a, Parameters(a.size(), 0.0), group);
}

class EveryOperator : public testing::TestWithParam<Kind> {};

TEST_P(EveryOperator, NamesTheStartBeforeAnythingIsLearned) {
  EXPECT_EQ(make_operator(grouped(GetParam(), 1), kStart)->incumbent(), kStart);
}

TEST_P(EveryOperator, ProposesTheSameOnReplayToTheBit) {
  const auto first = make_operator(grouped(GetParam(), 7), kStart);
  std::vector<Committed<Evaluation>> record;
  std::vector<Parameters> proposals;
  std::uint32_t number = 0;
  for (int i = 0; i < 20; ++i) {
    const std::vector<Proposal> batch = first->batch();
    for (const Proposal& p : batch) {
      record.push_back(walked(p.batch, p.index, bumpy(p, number++)));
      proposals.push_back(p.parameters);
      (void)first->observe(record.back());
    }
  }
  const auto second = make_operator(grouped(GetParam(), 7), kStart);
  std::size_t place = 0;
  for (const auto& evaluation : record) {
    const Proposal& asked = second->batch()[evaluation.value().index];
    EXPECT_EQ(asked.batch, evaluation.value().batch);
    EXPECT_EQ(asked.parameters, proposals[place++]);
    (void)second->observe(evaluation);
  }
  EXPECT_EQ(first->incumbent(), second->incumbent());
  EXPECT_NE(first->incumbent(), kStart) << "nothing was learned in 20 batches: the test shows nothing";
}

TEST_P(EveryOperator, ProposesOtherwiseWithAnotherSeed) {
  const auto one = make_operator(grouped(GetParam(), 1), kStart);
  const auto two = make_operator(grouped(GetParam(), 2), kStart);
  EXPECT_NE(one->batch().back().parameters, two->batch().back().parameters);
}

TEST_P(EveryOperator, DoesNotCareAboutTheOrderWithinABatch) {
  const auto forward = make_operator(grouped(GetParam(), 3), kStart);
  const auto backward = make_operator(grouped(GetParam(), 3), kStart);
  for (std::uint32_t i = 0; i < 10; ++i) {
    std::vector<Proposal> batch = forward->batch();
    for (const Proposal& p : batch)
      (void)forward->observe(walked(p.batch, p.index, bumpy(p, 100 * i + p.index)));
    std::reverse(batch.begin(), batch.end());
    for (const Proposal& p : batch)
      (void)backward->observe(walked(p.batch, p.index, bumpy(p, 100 * i + p.index)));
    EXPECT_EQ(forward->incumbent(), backward->incumbent());
  }
}

TEST_P(EveryOperator, KeepsTheBatchUntilAllOfItIsObserved) {
  const auto adaptation = make_operator(grouped(GetParam(), 4), kStart);
  const std::vector<Proposal> batch = adaptation->batch();
  for (std::size_t i = 0; i < batch.size(); ++i) {
    EXPECT_EQ(adaptation->batch().front().parameters, batch.front().parameters);
    EXPECT_EQ(adaptation->batch().front().batch, 0U);
    EXPECT_EQ(adaptation->observe(walked(0, batch[i].index, 1.0 + static_cast<double>(i))),
              i + 1 == batch.size());
  }
  EXPECT_EQ(adaptation->batch().front().batch, 1U);
}

TEST_P(EveryOperator, IgnoresVoidWalksOtherBatchesAndWhatItWasToldBefore) {
  const auto told = make_operator(grouped(GetParam(), 5), kStart);
  const auto pestered = make_operator(grouped(GetParam(), 5), kStart);
  for (std::uint32_t i = 0; i < 5; ++i) {
    const std::vector<Proposal> batch = told->batch();
    for (const Proposal& p : batch) {
      EXPECT_FALSE(pestered->observe(walked(p.batch, p.index, 1e9, Outcome::voided)));
      EXPECT_FALSE(pestered->observe(walked(p.batch + 1, p.index, 1e9)));
      EXPECT_FALSE(pestered->observe(walked(p.batch, static_cast<std::uint32_t>(batch.size()), 1e9)));
      const auto walk = walked(p.batch, p.index, bumpy(p, 50 * i + p.index));
      (void)told->observe(walk);
      (void)pestered->observe(walk);
      EXPECT_FALSE(pestered->observe(walked(p.batch, p.index, 1e9)));  // twice
    }
    EXPECT_EQ(told->incumbent(), pestered->incumbent());
  }
}

TEST_P(EveryOperator, StaysFiniteAndInsideTheTrustRegionWhateverTheReturns) {
  const std::vector<double> ugly{kNan, kInfinity, -kInfinity, 1e308, -1e308, 0.0, 1e-308, -5.0};
  Settings settings = grouped(GetParam(), 6);
  settings.groups[0].perturbation_scale = 5;  // far beyond the region: every proposal must be shrunk
  const auto adaptation = make_operator(settings, kStart);
  for (std::uint32_t i = 0; i < 200; ++i) {
    const std::vector<Proposal> batch = adaptation->batch();
    for (const Proposal& p : batch) {
      for (const double x : p.parameters) ASSERT_TRUE(std::isfinite(x));
      ASSERT_EQ(outside_trust_region(kStart, p.parameters, settings.groups, settings.trust_region),
                std::nullopt);
      ASSERT_EQ(p.parameters.back(), kStart.back()) << "belongs to no group";
      for (const Group& g : settings.groups)
        ASSERT_LE(norm_of_change(p.parameters, kStart, g), 0.5 * norm_of(kStart, g) * (1 + 1e-9));
      const std::uint64_t pick = random_bits(2, Stream::test, i, p.index) % ugly.size();
      (void)adaptation->observe(walked(p.batch, p.index, ugly[pick]));
    }
  }
  EXPECT_GT(norm_of_change(adaptation->batch().back().parameters, kStart, settings.groups[0]), 0.1);
}

TEST_P(EveryOperator, TakesNothingFromABatchOfWalksWithoutANumber) {
  const auto adaptation = make_operator(grouped(GetParam(), 8), kStart);
  run(*adaptation, 20, [](const Proposal&, std::uint32_t) { return kNan; });
  EXPECT_EQ(adaptation->incumbent(), kStart);
}

TEST_P(EveryOperator, IsNotPoisonedByANumberlessWalk) {
  const auto adaptation = make_operator(grouped(GetParam(), 9), kStart);
  const auto climb = [](const Proposal& p, std::uint32_t) { return -std::abs(p.parameters[0] - 1.3); };
  run(*adaptation, 2, [](const Proposal& p, std::uint32_t) { return p.index % 2 == 0 ? kNan : -10.0; });
  run(*adaptation, 60, climb);
  EXPECT_NEAR(adaptation->incumbent()[0], 1.3, 0.2);
}

TEST_P(EveryOperator, RefusesUnusableSettingsInOneLine) {
  const auto words = [&](const std::function<void(Settings&, Parameters&)>& spoil) {
    Settings settings = grouped(GetParam(), 1);
    Parameters start = kStart;
    spoil(settings, start);
    try {
      (void)make_operator(settings, start);
    } catch (const std::invalid_argument& refusal) {
      return std::string(refusal.what());
    }
    return std::string();
  };
  const std::vector<std::pair<std::function<void(Settings&, Parameters&)>, std::string>> cases{
      {[](Settings&, Parameters& p) { p.clear(); }, "no parameters"},
      {[](Settings&, Parameters& p) { p[3] = kNan; }, "not finite"},
      {[](Settings& s, Parameters&) { s.groups.clear(); }, "no parameter group"},
      {[](Settings& s, Parameters&) { s.groups[1].count = 5; }, "'feedback' reaches beyond"},
      {[](Settings& s, Parameters&) { s.groups[1].first = ~std::size_t{0}; }, "'feedback' reaches beyond"},
      {[](Settings& s, Parameters&) { s.groups[1].first = 1; }, "'feedback' overlaps"},
      {[](Settings& s, Parameters&) { s.groups[0].perturbation_scale = 0; }, "'gait' has no positive"},
      {[](Settings& s, Parameters&) { s.groups[0].perturbation_scale = kNan; }, "'gait' has no positive"},
      {[](Settings& s, Parameters&) { s.trust_region = kNan; }, "trust region"},
      {[](Settings& s, Parameters&) { s.trust_region = -1; }, "trust region"},
      {[](Settings& s, Parameters&) { s.kind = static_cast<Kind>(99); }, "no such operator"},
  };
  for (const auto& [spoil, expected] : cases) {
    const std::string line = words(spoil);
    EXPECT_NE(line.find(expected), std::string::npos) << "found '" << line << "', expected " << expected;
    EXPECT_EQ(line.find('\n'), std::string::npos);
  }
}

std::string name_of_kind(const testing::TestParamInfo<Kind>& tested) {
  constexpr std::array kNames{"Sequential", "Averaged", "Batch", "EsGradient"};
  return kNames.at(static_cast<std::size_t>(tested.param) - 1);
}

INSTANTIATE_TEST_SUITE_P(Kinds, EveryOperator,
                         testing::Values(Kind::sequential, Kind::averaged, Kind::batch, Kind::es_gradient),
                         name_of_kind);

TEST(Settings, BatchOfNothingIsRefused) {
  for (const Kind kind : {Kind::batch, Kind::es_gradient}) {
    Settings settings = grouped(kind, 1);
    settings.batch = 0;
    EXPECT_THROW((void)make_operator(settings, kStart), std::invalid_argument);
  }
  Settings settings = grouped(Kind::averaged, 1);
  settings.repeats = 0;
  EXPECT_THROW((void)make_operator(settings, kStart), std::invalid_argument);
  settings = grouped(Kind::es_gradient, 1);
  settings.step = kNan;
  EXPECT_THROW((void)make_operator(settings, kStart), std::invalid_argument);
}

TEST(TrustRegion, IsJudgedGroupByGroup) {
  const std::vector<Group> groups{{"gait", 0, 2, 0.1}, {"feedback", 2, 3, 0.1}};
  Parameters candidate = kStart;
  EXPECT_EQ(outside_trust_region(kStart, candidate, groups, 0.5), std::nullopt);
  candidate[0] += 0.49 * std::sqrt(5.0);
  EXPECT_EQ(outside_trust_region(kStart, candidate, groups, 0.5), std::nullopt);
  candidate[0] += 0.02 * std::sqrt(5.0);
  EXPECT_EQ(outside_trust_region(kStart, candidate, groups, 0.5), "gait");
  candidate = kStart;
  candidate[4] = kNan;
  EXPECT_EQ(outside_trust_region(kStart, candidate, groups, 0.5), "feedback");
  candidate[4] = kInfinity;
  EXPECT_EQ(outside_trust_region(kStart, candidate, groups, 0.5), "feedback");
}

TEST(TrustRegion, AnotherSizeOrAParameterOfNoGroupIsOutside) {
  const std::vector<Group> groups{{"gait", 0, 2, 0.1}, {"feedback", 2, 3, 0.1}};
  Parameters candidate = kStart;
  candidate.back() += 1e-6;
  EXPECT_TRUE(outside_trust_region(kStart, candidate, groups, 0.5).has_value());
  candidate.back() = kNan;
  EXPECT_TRUE(outside_trust_region(kStart, candidate, groups, 0.5).has_value());
  candidate.pop_back();
  EXPECT_TRUE(outside_trust_region(kStart, candidate, groups, 0.5).has_value());
  EXPECT_TRUE(outside_trust_region(kStart, {}, groups, 0.5).has_value());
}

TEST(TrustRegion, ANormThatOverflowsIsOutside) {
  const std::vector<Group> groups{{"all", 0, 2, 0.1}};
  EXPECT_TRUE(outside_trust_region({1e200, 1.0}, {-1e200, 1.0}, groups, 0.5).has_value());
  EXPECT_TRUE(
      outside_trust_region({1e200, 1.0}, {1e200, std::numeric_limits<double>::infinity()}, groups, 0.5)
          .has_value());
  EXPECT_TRUE(outside_trust_region({1.0, 1.0}, {1.0, kNan}, groups, 0.5).has_value());
}

TEST(TrustRegion, AGroupThatStartsAllZeroMayNotMove) {
  const Parameters start{1, 1, 0, 0};
  Settings settings = settings_of(Kind::es_gradient, 4, 0.1, 1);
  settings.groups = {{"gait", 0, 2, 0.1}, {"spare", 2, 2, 0.1}};
  settings.trust_region = 0.5;
  const auto adaptation = make_operator(settings, start);
  EXPECT_EQ(adaptation->batch()[0].parameters[2], 0.0);
  EXPECT_EQ(outside_trust_region(start, {1, 1, 1e-9, 0}, settings.groups, 0.5), "spare");
}

}  // namespace
}  // namespace pastern::adapt
