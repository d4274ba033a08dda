// The pure functions of clamps.h: values by hand, NaN and infinity, and a scalar that holds two numbers.
#include "safety/clamps.h"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <limits>
#include <random>

namespace pair_scalar {

/// Two doubles at once: what a lane of the packed runner is, as small as it can be.
struct Mask {
  std::array<bool, 2> on;
};
struct Pair {
  std::array<double, 2> x;
  Pair(double both) : x{both, both} {}  // NOLINT: implicit as a scalar's is
  Pair(double a, double b) : x{a, b} {}
};
inline Pair operator+(const Pair& a, const Pair& b) { return {a.x[0] + b.x[0], a.x[1] + b.x[1]}; }
inline Pair operator-(const Pair& a, const Pair& b) { return {a.x[0] - b.x[0], a.x[1] - b.x[1]}; }
inline Pair operator*(const Pair& a, const Pair& b) { return {a.x[0] * b.x[0], a.x[1] * b.x[1]}; }
inline Pair operator/(const Pair& a, const Pair& b) { return {a.x[0] / b.x[0], a.x[1] / b.x[1]}; }
inline Pair operator-(const Pair& a) { return {-a.x[0], -a.x[1]}; }
inline Mask operator<(const Pair& a, const Pair& b) { return {{a.x[0] < b.x[0], a.x[1] < b.x[1]}}; }
inline Mask operator>(const Pair& a, const Pair& b) { return b < a; }
inline Mask operator<=(const Pair& a, const Pair& b) { return {{a.x[0] <= b.x[0], a.x[1] <= b.x[1]}}; }
inline Mask operator>=(const Pair& a, const Pair& b) { return b <= a; }
inline Pair select(const Mask& m, const Pair& a, const Pair& b) {
  return {m.on[0] ? a.x[0] : b.x[0], m.on[1] ? a.x[1] : b.x[1]};
}

}  // namespace pair_scalar

namespace pastern::safety {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInf = std::numeric_limits<double>::infinity();

TEST(Clamps, PeakLimitsBothSignsAndLeavesTheRest) {
  EXPECT_EQ(peak_clamp(29.0, 30.0), 29.0);
  EXPECT_EQ(peak_clamp(30.0, 30.0), 30.0);
  EXPECT_EQ(peak_clamp(30.5, 30.0), 30.0);
  EXPECT_EQ(peak_clamp(-31.0, 30.0), -30.0);
  EXPECT_EQ(peak_clamp(kInf, 30.0), 30.0);
  EXPECT_EQ(peak_clamp(-kInf, 30.0), -30.0);
  EXPECT_EQ(peak_clamp(1e308, 0.0), 0.0);
}

TEST(Clamps, PeakTurnsNanIntoNoTorque) { EXPECT_EQ(peak_clamp(kNan, 30.0), 0.0); }

TEST(Clamps, SlewLimitsTheChange) {
  EXPECT_EQ(slew_clamp(10.0, 8.0, 5.0), 10.0);
  EXPECT_EQ(slew_clamp(20.0, 8.0, 5.0), 13.0);
  EXPECT_EQ(slew_clamp(-20.0, 8.0, 5.0), 3.0);
  EXPECT_EQ(slew_clamp(kInf, 8.0, 5.0), 13.0);
  EXPECT_EQ(slew_clamp(kNan, 8.0, 5.0), 3.0);
}

TEST(Clamps, EdgeFadesOutwardTorqueOnly) {
  // Range -1 .. 2 with 0.1 rad of soft edge; half way into it half the torque is left.
  EXPECT_NEAR(edge_fade(10.0, 1.95, -1.0, 2.0, 0.1), 5.0, 1e-9);
  EXPECT_NEAR(edge_fade(-10.0, -0.95, -1.0, 2.0, 0.1), -5.0, 1e-9);
  EXPECT_EQ(edge_fade(-10.0, 1.95, -1.0, 2.0, 0.1), -10.0);
  EXPECT_EQ(edge_fade(10.0, -0.95, -1.0, 2.0, 0.1), 10.0);
  EXPECT_EQ(edge_fade(10.0, 0.0, -1.0, 2.0, 0.1), 10.0);
  EXPECT_EQ(edge_fade(10.0, 2.0, -1.0, 2.0, 0.1), 0.0);
  EXPECT_EQ(edge_fade(10.0, 2.5, -1.0, 2.0, 0.1), 0.0);
  EXPECT_EQ(edge_fade(10.0, kNan, -1.0, 2.0, 0.1), 0.0);
  EXPECT_EQ(edge_fade(10.0, 2.5, -1.0, 2.0, 0.0), 0.0);
}

TEST(Clamps, SpeedFadesAcceleratingTorqueOnly) {
  EXPECT_NEAR(speed_fade(10.0, 18.0, 16.0, 20.0), 5.0, 1e-9);
  EXPECT_NEAR(speed_fade(-10.0, -18.0, 16.0, 20.0), -5.0, 1e-9);
  EXPECT_EQ(speed_fade(-10.0, 18.0, 16.0, 20.0), -10.0);
  EXPECT_EQ(speed_fade(10.0, 16.0, 16.0, 20.0), 10.0);
  EXPECT_EQ(speed_fade(10.0, 21.0, 16.0, 20.0), 0.0);
  EXPECT_EQ(speed_fade(10.0, kNan, 16.0, 20.0), 0.0);
}

TEST(Clamps, AScalarOfTwoNumbersGivesWhatEachAloneGives) {
  using pair_scalar::Pair;
  std::mt19937_64 random(7);  // engines are fixed by the C++ standard, distributions are not
  const auto draw = [&random](double size) {
    return size * (static_cast<double>(random() >> 11) * 0x1p-52 - 1.0);
  };
  for (int i = 0; i < 2000; ++i) {
    const std::array<double, 2> torque{draw(60.0), draw(60.0)};
    const std::array<double, 2> angle{draw(3.0), draw(3.0)};
    const std::array<double, 2> speed{draw(25.0), draw(25.0)};
    const std::array<double, 2> before{draw(30.0), draw(30.0)};
    const auto whole = [](const auto& t, const auto& a, const auto& v, const auto& b) {
      using S = std::decay_t<decltype(t)>;
      const S inside = edge_fade(t, a, S(-1.0), S(2.0), S(0.1));
      return slew_clamp(peak_clamp(speed_fade(inside, v, S(16.0), S(20.0)), S(30.0)), b, S(5.0));
    };
    const Pair both = whole(Pair(torque[0], torque[1]), Pair(angle[0], angle[1]), Pair(speed[0], speed[1]),
                            Pair(before[0], before[1]));
    for (std::size_t k = 0; k < 2; ++k) {
      EXPECT_EQ(both.x[k], whole(torque[k], angle[k], speed[k], before[k]));
    }
  }
}

}  // namespace
}  // namespace pastern::safety
