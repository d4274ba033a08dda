// Hill climbing: the setting of the theorem in arXiv:2003.01239, drift, invariance, point navigation.
#include "runtime/adapt/hill_climbing.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <cstdio>

#include "tests/runtime/adapt/on_disk.h"
#include "tests/runtime/adapt/point_navigation.h"

namespace pastern::adapt {
namespace {

constexpr std::size_t kSize = 5;

// -1/2 sum c_i (x_i - m_i)^2 with 1 <= c_i <= 4: strongly concave and smooth; greatest value 0.
double concave(const Parameters& x) {
  double value = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    const double curvature = 1 + 3 * static_cast<double>(i) / static_cast<double>(x.size() - 1);
    const double off = x[i] - (i % 2 == 0 ? 1.0 : -0.5);
    value -= 0.5 * curvature * off * off;
  }
  return value;
}

// One walk in twenty is hit by noise without a lower bound (minus a Cauchy magnitude), the others by an
// adversary within +-bound: he takes from what is better than the middle of the batch and gives to what is
// worse.
class Adversary {
 public:
  Adversary(double bound, std::uint64_t seed) : bound_(bound), seed_(seed) {}

  double walk(const Proposal& proposal, std::uint32_t number) {
    const double truth = concave(proposal.parameters);
    if (random_uniform(seed_, Stream::test, number, 0) < 0.05)
      return truth - std::abs(std::tan(3.14159 * (random_uniform(seed_, Stream::test, number, 1) - 0.5)));
    const bool better = truth > middle_;
    middle_ += 0.1 * (truth - middle_);
    return truth + (better ? -bound_ : bound_);
  }

 private:
  double bound_;
  std::uint64_t seed_;
  double middle_{0};
};

// Median over nine seeds of the true shortfall (0 = at the optimum) of the incumbent after 400 batches of 8.
// The perturbations grow with the root of the noise bound, as in the theorem's setting: a gain of sigma
// |gradient| must stand out from twice the bound.
double shortfall(double bound, bool remeasure) {
  std::vector<double> all;
  for (std::uint64_t seed = 1; seed <= 9; ++seed) {
    Settings settings = settings_of(Kind::batch, kSize, 0.45 * std::sqrt(bound), seed);
    settings.batch = 8;
    settings.remeasure = remeasure;
    const auto adaptation = make_operator(settings, Parameters(kSize, 2.0));
    Adversary adversary(bound, seed);
    run(*adaptation, 400, [&](const Proposal& p, std::uint32_t n) { return adversary.walk(p, n); });
    all.push_back(-concave(adaptation->incumbent()));
  }
  std::nth_element(all.begin(), all.begin() + 4, all.end());
  return all[4];
}

TEST(BatchHillClimbing, ReachesANeighbourhoodThatScalesWithTheNoiseBound) {
  const double start = -concave(Parameters(kSize, 2.0));
  for (const bool remeasure : {false, true}) {
    double last = 0;
    for (const double bound : {0.005, 0.05, 0.5}) {
      const double found = shortfall(bound, remeasure);
      std::printf("remeasure %d bound %.3f shortfall %.4f of %.2f\n", remeasure ? 1 : 0, bound, found, start);
      EXPECT_LT(found, 4 * bound) << "bound " << bound;
      EXPECT_GT(found, last) << "no larger than with a tenth of the noise: the noise does not act";
      last = found;
    }
  }
}

TEST(BatchHillClimbing, ReachesTheOptimumWithoutNoise) {
  for (const Kind kind : {Kind::sequential, Kind::averaged, Kind::batch}) {
    Settings settings = settings_of(kind, kSize, 0.1, 3);
    const auto adaptation = make_operator(settings, Parameters(kSize, 2.0));
    run(*adaptation, 1500, [](const Proposal& p, std::uint32_t) { return concave(p.parameters); });
    EXPECT_LT(-concave(adaptation->incumbent()), 0.02) << adaptation->name();
  }
}

TEST(BatchHillClimbing, NeverAcceptsAStepThatIsWorseByMoreThanTwiceTheNoiseBound) {
  // checks: best of p by values within +-eps of the truth is within 2 eps of the best.
  constexpr double kBound = 0.2;
  Settings settings = settings_of(Kind::batch, kSize, 0.2, 5);
  const auto adaptation = make_operator(settings, Parameters(kSize, 2.0));
  for (std::uint32_t i = 0; i < 300; ++i) {
    const double before = concave(adaptation->incumbent());
    double best = before;
    const std::vector<Proposal> batch = adaptation->batch();
    for (const Proposal& p : batch) {
      best = std::max(best, concave(p.parameters));
      const double noise = kBound * (2 * random_uniform(4, Stream::test, i, p.index) - 1);
      (void)adaptation->observe(walked(p.batch, p.index, concave(p.parameters) + noise));
    }
    EXPECT_GE(concave(adaptation->incumbent()), best - 2 * kBound);
  }
}

TEST(HillClimbing, RankBasedFormsFollowTheSameCourseUnderOrderPreservingTransforms) {
  const std::vector<std::function<double(double)>> transforms{[](double r) { return r * r * r; },
                                                              [](double r) { return std::exp(r); },
                                                              [](double r) { return std::atan(r) - 7; }};
  for (const Kind kind : {Kind::sequential, Kind::batch}) {
    for (const auto& transform : transforms) {
      const auto plain = make_operator(settings_of(kind, kSize, 0.1, 12), Parameters(kSize, 2.0));
      const auto bent = make_operator(settings_of(kind, kSize, 0.1, 12), Parameters(kSize, 2.0));
      const auto noisy = [](const Proposal& p, std::uint32_t n) {
        return 0.2 * concave(p.parameters) + 0.1 * random_normal(1, Stream::test, n, 0);
      };
      run(*plain, 100, noisy);
      run(*bent, 100, [&](const Proposal& p, std::uint32_t n) { return transform(noisy(p, n)); });
      EXPECT_EQ(plain->incumbent(), bent->incumbent());
      EXPECT_NE(plain->incumbent(), Parameters(kSize, 2.0));
    }
  }
}

TEST(HillClimbing, IsTheSameAnywhereInTheSpaceToRounding) {
  const auto here = make_operator(settings_of(Kind::batch, kSize, 0.1, 2), Parameters(kSize, 2.0));
  const auto there = make_operator(settings_of(Kind::batch, kSize, 0.1, 2), Parameters(kSize, 102.0));
  run(*here, 100, [](const Proposal& p, std::uint32_t) { return concave(p.parameters); });
  run(*there, 100, [](const Proposal& p, std::uint32_t) {
    Parameters moved = p.parameters;
    for (double& x : moved) x -= 100;
    return concave(moved);
  });
  for (std::size_t i = 0; i < kSize; ++i)
    EXPECT_NEAR(here->incumbent()[i] + 100, there->incumbent()[i], 1e-9);
}

TEST(HillClimbing, RemeasuringTheIncumbentKeepsItFromFreezingUnderDrift) {
  // The robot wears: every walk is worth .02 less than the one before.
  const auto climbed = [](bool remeasure) {
    double sum = 0;
    for (std::uint64_t seed = 1; seed <= 5; ++seed) {
      Settings settings = settings_of(Kind::batch, kSize, 0.1, seed);
      settings.remeasure = remeasure;
      const auto adaptation = make_operator(settings, Parameters(kSize, 2.0));
      run(*adaptation, 200, [](const Proposal& p, std::uint32_t n) {
        return concave(p.parameters) - 0.02 * n + 0.1 * random_normal(6, Stream::test, n, 0);
      });
      sum -= concave(adaptation->incumbent());
    }
    return sum / 5;
  };
  const double remembered = climbed(false);
  const double remeasured = climbed(true);
  std::printf("shortfall under drift: remembered %.3f, remeasured %.3f\n", remembered, remeasured);
  EXPECT_GT(remembered, 3 * remeasured);
  EXPECT_LT(remeasured, 0.5);
}

TEST(HillClimbing, BatchesAreMadeAsDocumented) {
  Settings settings = settings_of(Kind::batch, kSize, 0.1, 1);
  settings.batch = 4;
  auto adaptation = make_operator(settings, Parameters(kSize, 2.0));
  EXPECT_EQ(adaptation->batch().size(), 5U);  // the incumbent first
  EXPECT_EQ(adaptation->batch()[0].parameters, Parameters(kSize, 2.0));
  settings.remeasure = false;
  adaptation = make_operator(settings, Parameters(kSize, 2.0));
  EXPECT_EQ(adaptation->batch().size(), 5U);  // the start must be measured once
  run(*adaptation, 1, [](const Proposal& p, std::uint32_t) { return concave(p.parameters); });
  EXPECT_EQ(adaptation->batch().size(), 4U);

  settings = settings_of(Kind::averaged, kSize, 0.1, 1);
  settings.repeats = 3;
  adaptation = make_operator(settings, Parameters(kSize, 2.0));
  EXPECT_EQ(adaptation->batch().size(), 6U);  // three of the start, three of one candidate
  EXPECT_EQ(adaptation->batch()[3].parameters, adaptation->batch()[5].parameters);
  run(*adaptation, 1, [](const Proposal& p, std::uint32_t) { return p.index < 3 ? 0.0 : -1.0; });
  EXPECT_EQ(adaptation->batch().size(), 4U);  // one to renew the incumbent's mean
}

TEST(HillClimbing, AveragedTakesTheMeanOverTheBestSingleWalk) {
  Settings settings = settings_of(Kind::averaged, kSize, 0.1, 1);
  const auto lucky = make_operator(settings, Parameters(kSize, 2.0));
  run(*lucky, 1, [](const Proposal& p, std::uint32_t) {
    return p.index < 3 ? 1.0 : p.index == 3 ? 3.0 : -0.5;
  });
  EXPECT_EQ(lucky->incumbent(), Parameters(kSize, 2.0));  // mean .67 against 1
  const auto better = make_operator(settings, Parameters(kSize, 2.0));
  run(*better, 1, [](const Proposal& p, std::uint32_t) {
    return p.index < 3 ? 1.0 : p.index == 3 ? 0.5 : 1.4;
  });
  EXPECT_NE(better->incumbent(), Parameters(kSize, 2.0));  // mean 1.1 against 1
}

TEST(HillClimbing, FindsTheCornersInPointNavigationWithPushes) {
  Settings settings = settings_of(Kind::batch, 6, 0.5, 0);
  settings.batch = 4;
  const double start = distance_after(settings, 0);
  const double batch = distance_after(settings, 50);
  settings.kind = Kind::sequential;
  const double sequential = distance_after(settings, 50);
  std::printf("distance to the goal: start %.3f, batch %.3f, sequential %.3f after 50 walks\n", start, batch,
              sequential);
  EXPECT_LT(batch, 0.35 * start);
  EXPECT_LT(sequential, 0.6 * start);
}

}  // namespace
}  // namespace pastern::adapt
