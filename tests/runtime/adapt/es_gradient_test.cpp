// The ES gradient against the moments of antithetic Gaussian smoothing, its bounds, its invariances, and how
// many walks it takes.
#include "runtime/adapt/es_gradient.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <limits>

#include "tests/runtime/adapt/on_disk.h"
#include "tests/runtime/adapt/point_navigation.h"

namespace pastern::adapt {
namespace {

constexpr std::size_t kSize = 10;

// f = 1/2 x' diag(1..10) x at x = 1 (checked quantities below are derived for it: gradient (1..10)).
double quadratic(const Parameters& x) {
  double value = 0;
  for (std::size_t i = 0; i < x.size(); ++i) value += 0.5 * static_cast<double>(i + 1) * x[i] * x[i];
  return value;
}

struct Estimate {
  Parameters mean;
  double mean_square{0};
  double mean_cosine{0};
};

// `trials` estimates from p pairs each at x = (1, ..., 1), noise of standard deviation `noise` on every walk.
Estimate estimate(std::uint32_t p, double sigma, double noise, std::uint32_t trials) {
  Estimate result{Parameters(kSize, 0.0), 0, 0};
  for (std::uint32_t trial = 0; trial < trials; ++trial) {
    std::vector<Parameters> directions;
    std::vector<double> differences;
    for (std::uint32_t pair = 0; pair < p; ++pair) {
      Parameters g(kSize);
      Parameters plus(kSize, 1.0);
      Parameters minus(kSize, 1.0);
      for (std::uint32_t i = 0; i < kSize; ++i) {
        g[i] = random_normal(21, Stream::test, trial, pair, i);
        plus[i] += sigma * g[i];
        minus[i] -= sigma * g[i];
      }
      differences.push_back(quadratic(plus) - quadratic(minus) +
                            noise * (random_normal(22, Stream::test, trial, pair, 0) -
                                     random_normal(22, Stream::test, trial, pair, 1)));
      directions.push_back(g);
    }
    const Parameters gradient = antithetic_gradient(differences, directions, sigma);
    double square = 0;
    double inner = 0;
    for (std::size_t i = 0; i < kSize; ++i) {
      result.mean[i] += gradient[i] / trials;
      square += gradient[i] * gradient[i];
      inner += gradient[i] * static_cast<double>(i + 1);
    }
    result.mean_square += square / trials;
    result.mean_cosine += inner / std::sqrt(square * 385) / trials;
  }
  return result;
}

TEST(AntitheticGradient, HasTheMomentsOfGaussianSmoothing) {
  // E|g^|^2 = |g|^2 (1 + (n + 1)/p) + n noise^2 / (2 sigma^2 p), derived after Nesterov and Spokoiny, Found.
  // Comput. Math. 17 (2017) 527-566; |g|^2 = 385.
  struct Case {
    std::uint32_t p;
    double sigma;
    double noise;
    double expected;
  };
  for (const Case& c : {Case{1, 0.1, 0, 4620},
                        {5, 0.1, 0, 1232},
                        {20, 0.1, 0, 596.75},
                        {5, 0.1, 0.5, 1257},
                        {20, 0.5, 2, 600.75}}) {
    const Estimate e = estimate(c.p, c.sigma, c.noise, 200000 / c.p);
    EXPECT_NEAR(e.mean_square / c.expected, 1, 0.02) << "p " << c.p;
  }
}

TEST(AntitheticGradient, IsUnbiasedOnAQuadraticForAnySigma) {
  for (const double sigma : {0.01, 1.0, 10.0}) {
    const Estimate e = estimate(5, sigma, 0, 20000);
    // Standard error of a component: sqrt((|g|^2 + g_i^2) / (5 * 20000)) <= .07; five of them.
    for (std::size_t i = 0; i < kSize; ++i) EXPECT_NEAR(e.mean[i], static_cast<double>(i + 1), 0.35);
  }
}

TEST(AntitheticGradient, PointsAsWellAsTheBetaLawSays) {
  // cos^2 ~ Beta(p/2, (n - 1)/2); E cos for n = 10.
  for (const auto& [p, expected] :
       {std::pair<std::uint32_t, double>{1, 0.258690}, {5, 0.578887}, {10, 0.716961}, {20, 0.827242}}) {
    EXPECT_NEAR(estimate(p, 0.1, 0, 20000).mean_cosine, expected, 0.01) << "p " << p;
  }
}

TEST(AntitheticGradient, BoundedAdversarialErrorMovesItAtMostByItsBound) {
  constexpr double kBound = 0.05;
  constexpr double kSigma = 0.1;
  double mean_norm = 0;
  constexpr std::uint32_t kTrials = 20000;
  for (std::uint32_t trial = 0; trial < kTrials; ++trial) {
    Parameters g(kSize);
    double norm = 0;
    for (std::uint32_t i = 0; i < kSize; ++i) {
      g[i] = random_normal(23, Stream::test, trial, i);
      norm += g[i] * g[i];
    }
    norm = std::sqrt(norm);
    const Parameters error =
        antithetic_gradient({2 * kBound}, {g}, kSigma);  // +eps on one walk, -eps on the other
    double size = 0;
    for (const double x : error) size += x * x;
    EXPECT_LE(std::sqrt(size), kBound * norm / kSigma * (1 + 1e-12));
    mean_norm += std::sqrt(size) / kTrials;
  }
  EXPECT_LE(mean_norm, kBound * std::sqrt(10.0) / kSigma);  // 1.5811
  EXPECT_GT(mean_norm, 0.95 * kBound * std::sqrt(10.0) / kSigma);
}

TEST(NormalisedDifferences, HaveUnitSpread) {
  const std::vector<double> d = normalised_differences({0.3, -0.2, 0.1, 0.25, -0.4});
  double sum = 0;
  for (const double x : d) sum += x * x;
  EXPECT_NEAR(sum / 5, 1, 1e-12);
  EXPECT_NEAR(d[0] / d[1], -1.5, 1e-12);
}

TEST(NormalisedDifferences, AFallIsClippedToThreeMedians) {
  const std::vector<double> d = normalised_differences({0.1, -0.2, 0.15, -50, 0.1});
  EXPECT_NEAR(d[3] / d[2], -3, 1e-12);  // median magnitude .15
  const std::vector<double> worst =
      normalised_differences({0.1, -0.2, 0.15, -std::numeric_limits<double>::infinity(), 0.1});
  EXPECT_EQ(d, worst) << "how bad a fall is makes no difference";
}

TEST(NormalisedDifferences, CopeWithNothingWithOneAndWithHugeOnes) {
  EXPECT_EQ(normalised_differences({0, 0, 0}), (std::vector<double>{0, 0, 0}));
  EXPECT_EQ(normalised_differences({}), std::vector<double>{});
  EXPECT_EQ(normalised_differences({-7}), (std::vector<double>{-1}));
  const double infinity = std::numeric_limits<double>::infinity();
  for (const double x : normalised_differences({1e308, -1e308, infinity, -infinity, 5e-324}))
    EXPECT_TRUE(std::isfinite(x));
  EXPECT_GT(normalised_differences({0, 0, infinity})[2], 1.0);
  EXPECT_GT(normalised_differences({0.1, infinity, infinity})[1], 1.0);
}

Settings es(std::size_t size, double scale, std::uint64_t seed) {
  Settings settings = settings_of(Kind::es_gradient, size, scale, seed);
  settings.step = 1.0;
  return settings;
}

TEST(EsGradient, PairsAreAntitheticRoundTheCentreAndFollowOneAnother) {
  const Parameters start{1, 2, 3, 4};
  const auto adaptation = make_operator(es(4, 0.1, 5), start);
  ASSERT_EQ(adaptation->batch().size(), 10U);
  for (std::size_t pair = 0; pair < 5; ++pair)
    for (std::size_t i = 0; i < 4; ++i)
      EXPECT_NEAR(
          (adaptation->batch()[2 * pair].parameters[i] + adaptation->batch()[2 * pair + 1].parameters[i]) / 2,
          start[i], 1e-12);
}

TEST(EsGradient, StepsByTheFormula) {
  const Parameters start{1, 2, 3, 4};
  Settings settings = es(4, 0.1, 5);
  settings.step = 0.7;
  const auto adaptation = make_operator(settings, start);
  const std::vector<Proposal> batch = adaptation->batch();
  const std::vector<double> returns{1.0, 0.5, 0.2, 0.3, 0.9, 1.3, 0.7, 0.7, 0.1, -0.2};
  for (const Proposal& p : batch) (void)adaptation->observe(walked(p.batch, p.index, returns[p.index]));
  // Differences .5 -.1 -.4 0 .3; the median of the magnitudes that are not zero is .3: nothing is clipped.
  const double spread = std::sqrt((0.25 + 0.01 + 0.16 + 0.09) / 5);
  for (std::size_t i = 0; i < 4; ++i) {
    double sum = 0;
    for (std::size_t pair = 0; pair < 5; ++pair)
      sum += (returns[2 * pair] - returns[2 * pair + 1]) / spread *
             (batch[2 * pair].parameters[i] - start[i]) / 5;
    EXPECT_NEAR(adaptation->incumbent()[i], start[i] + 0.7 * sum, 1e-12);
  }
}

TEST(EsGradient, StepIsBoundedWhateverTheReturns) {
  const Parameters start(kSize, 1.0);
  const auto adaptation = make_operator(es(kSize, 0.1, 6), start);
  for (std::uint32_t i = 0; i < 50; ++i) {
    const Parameters before = adaptation->incumbent();
    const std::vector<Proposal> batch = adaptation->batch();
    double longest = 0;
    for (const Proposal& p : batch) {
      double square = 0;
      for (std::size_t k = 0; k < kSize; ++k)
        square += (p.parameters[k] - before[k]) * (p.parameters[k] - before[k]);
      longest = std::max(longest, std::sqrt(square));
      const double heavy = std::tan(3.14159 * (random_uniform(7, Stream::test, i, p.index) - 0.5));
      (void)adaptation->observe(walked(p.batch, p.index, -std::exp(5 * heavy)));
    }
    double step = 0;
    for (std::size_t k = 0; k < kSize; ++k)
      step += (adaptation->incumbent()[k] - before[k]) * (adaptation->incumbent()[k] - before[k]);
    EXPECT_LE(std::sqrt(step), 1.0 * longest * (1 + 1e-9));
  }
}

TEST(EsGradient, TheUnitOfTheReturnDoesNotMatter) {
  const auto plain = make_operator(es(kSize, 0.1, 8), Parameters(kSize, 1.0));
  const auto other = make_operator(es(kSize, 0.1, 8), Parameters(kSize, 1.0));
  run(*plain, 30, [](const Proposal& p, std::uint32_t) { return -quadratic(p.parameters); });
  run(*other, 30, [](const Proposal& p, std::uint32_t) { return 1024 * -quadratic(p.parameters); });
  EXPECT_EQ(plain->incumbent(), other->incumbent());
}

TEST(EsGradient, IsTheSameAnywhereInTheSpaceToRounding) {
  const auto here = make_operator(es(kSize, 0.1, 8), Parameters(kSize, 1.0));
  const auto there = make_operator(es(kSize, 0.1, 8), Parameters(kSize, 101.0));
  run(*here, 30, [](const Proposal& p, std::uint32_t) { return -quadratic(p.parameters); });
  run(*there, 30, [](const Proposal& p, std::uint32_t) {
    Parameters moved = p.parameters;
    for (double& x : moved) x -= 100;
    return -quadratic(moved);
  });
  for (std::size_t i = 0; i < kSize; ++i)
    EXPECT_NEAR(here->incumbent()[i] + 100, there->incumbent()[i], 1e-8);
}

TEST(EsGradient, DriftAndSagEnterBothWalksOfAPairAlike) {
  const auto shortfall = [](double drift_a_walk) {
    double sum = 0;
    for (std::uint64_t seed = 1; seed <= 9; ++seed) {
      const auto adaptation = make_operator(es(kSize, 0.05, seed), Parameters(kSize, 1.0));
      run(*adaptation, 60,
          [&](const Proposal& p, std::uint32_t n) { return -quadratic(p.parameters) - drift_a_walk * n; });
      sum += quadratic(adaptation->incumbent());
    }
    return sum / 9;
  };
  const double still = shortfall(0);
  const double drifting = shortfall(0.05);
  std::printf("shortfall after 60 batches: %.3f, with drift %.3f, start %.1f\n", still, drifting,
              quadratic(Parameters(kSize, 1.0)));
  EXPECT_LT(drifting, 2 * still + 0.5);
}

// Walks until the shortfall is under a tenth of the start's; n = 20, noise of a tenth of the start's
// shortfall.
std::uint32_t walks_to_target(std::uint64_t seed, double noise) {
  constexpr std::size_t kLarge = 20;
  const auto adaptation = make_operator(es(kLarge, 0.1, seed), Parameters(kLarge, 1.0));
  std::uint32_t walks = 0;
  while (quadratic(adaptation->incumbent()) > 10.5 && walks < 4000) {
    walks += run(*adaptation, 1, [&](const Proposal& p, std::uint32_t n) {
      return -quadratic(p.parameters) + noise * random_normal(seed, Stream::test, walks + n, 0);
    });
  }
  return walks;
}

TEST(EsGradient, ReachesATenthOfTheStartsShortfallWithinAKnownNumberOfWalks) {
  std::vector<std::uint32_t> quiet;
  std::vector<std::uint32_t> noisy;
  for (std::uint64_t seed = 1; seed <= 15; ++seed) {
    quiet.push_back(walks_to_target(seed, 0));
    noisy.push_back(walks_to_target(seed, 10));
  }
  std::sort(quiet.begin(), quiet.end());
  std::sort(noisy.begin(), noisy.end());
  std::printf("walks to target: median %u, most %u; with noise median %u, most %u\n", quiet[7], quiet[14],
              noisy[7], noisy[14]);
  EXPECT_LE(quiet[7], 450U);
  EXPECT_LE(noisy[7], 1600U);
}

TEST(EsGradient, FindsTheCornersInPointNavigationWithPushes) {
  Settings settings = es(6, 0.5, 0);
  settings.batch = 4;
  const double start = distance_after(settings, 0);
  const double after = distance_after(settings, 50);
  std::printf("distance to the goal: start %.3f, after 50 walks %.3f\n", start, after);
  EXPECT_LT(after, 0.35 * start);
}

}  // namespace
}  // namespace pastern::adapt
