// The elementary functions of lanes against the C library in a wider type (float against double, double
// against x87's or quad long double), in units of the last place of the result.
#include "tools/packed/functions.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <random>

namespace pastern::packed::PASTERN_LANES_SET {
namespace {

template <class T>
using Wider = std::conditional_t<sizeof(T) == 4, double, long double>;

// Distance in units of the last place of the exact value, subnormal steps at the least.
template <class T>
double ulps(T got, Wider<T> exact) {
  const T rounded = static_cast<T>(exact);
  if (std::isnan(got) || std::isnan(rounded)) return std::isnan(got) == std::isnan(rounded) ? 0 : 1e30;
  if (std::isinf(got) || std::isinf(rounded)) return got == rounded ? 0 : 1e30;
  const T size = std::max(std::abs(rounded), std::numeric_limits<T>::min());
  int exponent = 0;
  static_cast<void>(std::frexp(size, &exponent));
  const auto unit = std::ldexp(Wider<T>(1), exponent - std::numeric_limits<T>::digits);
  return static_cast<double>(std::abs(Wider<T>(got) - exact) / unit);
}

template <class L>
class FunctionsTest : public testing::Test {
 protected:
  using Number = typename L::Constant;

  // The largest error over `low`..`high`, evenly and towards both ends by powers, in whole lanes.
  template <class F, class Exact>
  static double worst(F f, Exact exact, double low, double high) {
    std::mt19937_64 engine(20);
    std::uniform_real_distribution<double> even(low, high);
    std::uniform_real_distribution<double> power(-40, 0);
    double most = 0;
    for (int turn = 0; turn < 40000 / L::kLanes * 4; ++turn) {
      L x{};
      for (int i = 0; i < L::kLanes; ++i) {
        const double small = std::exp2(power(engine));
        x.put(i,
              static_cast<Number>(turn % 4 == 0 ? std::max(low, std::min(high, (i % 2 == 0 ? 1 : -1) * small))
                                  : turn % 4 == 1 ? high - (high - low) * small
                                                  : even(engine)));
      }
      const L y = f(x);
      for (int i = 0; i < L::kLanes; ++i) {
        const double error = ulps<Number>(y[i], exact(Wider<Number>(x[i])));
        if (error > most) most = error;
      }
    }
    std::printf("[ worst ] %.3f ulp\n", most);
    return most;
  }
};

using Kinds =
    testing::Types<Floats, Doubles, Lanes<float, 16>, Lanes<float, 8>, Lanes<double, 8>, Lanes<double, 4>>;
TYPED_TEST_SUITE(FunctionsTest, Kinds);

template <class L>
L one(double a) {
  return L(static_cast<typename L::Constant>(a));
}

TYPED_TEST(FunctionsTest, ExpIsWithinTwoUnits) {
  using L = TypeParam;
  using W = Wider<typename L::Constant>;
  const double end = sizeof(typename L::Constant) == 4 ? 88 : 709;
  EXPECT_LE(this->worst([](const L& x) { return exp(x); }, [](W x) { return std::exp(x); }, -end * 1.17, end),
            2);
  EXPECT_LE(this->worst([](const L& x) { return exp(x); }, [](W x) { return std::exp(x); }, -1, 1), 2);
  EXPECT_EQ(exp(one<L>(0))[0], 1);
  EXPECT_TRUE(std::isinf(exp(one<L>(1e4))[0]));
  EXPECT_TRUE(std::isinf(exp(one<L>(HUGE_VAL))[0]));
  EXPECT_EQ(exp(one<L>(-1e4))[0], 0);
  EXPECT_EQ(exp(one<L>(-HUGE_VAL))[0], 0);
  EXPECT_TRUE(std::isnan(exp(one<L>(NAN))[0]));
}

TYPED_TEST(FunctionsTest, LogIsWithinTwoUnits) {
  using L = TypeParam;
  using T = typename L::Constant;
  using W = Wider<T>;
  const auto f = [](const L& x) { return log(x); };
  const auto exact = [](W x) { return std::log(x); };
  EXPECT_LE(this->worst(f, exact, 1e-37, 1), 2);
  EXPECT_LE(this->worst(f, exact, 0.5, 2), 2);
  EXPECT_LE(this->worst(f, exact, 1, 1e30), 2);
  EXPECT_EQ(log(one<L>(1))[0], 0);
  EXPECT_EQ(log(one<L>(0))[0], T(-HUGE_VAL));
  EXPECT_EQ(log(one<L>(HUGE_VAL))[0], T(HUGE_VAL));
  EXPECT_TRUE(std::isnan(log(one<L>(-1))[0]));
  EXPECT_TRUE(std::isnan(log(one<L>(NAN))[0]));
  const T least = std::numeric_limits<T>::denorm_min();
  EXPECT_LE(ulps<T>(log(L(least))[0], std::log(W(least))), 2);
}

TYPED_TEST(FunctionsTest, TanhIsWithinThreeUnits) {
  using L = TypeParam;
  using W = Wider<typename L::Constant>;
  const auto f = [](const L& x) { return tanh(x); };
  const auto exact = [](W x) { return std::tanh(x); };
  EXPECT_LE(this->worst(f, exact, -1, 1), 3);
  EXPECT_LE(this->worst(f, exact, -30, 30), 3);
  EXPECT_TRUE(std::signbit(tanh(one<L>(-0.0))[0]));
  EXPECT_EQ(tanh(one<L>(HUGE_VAL))[0], 1);
  EXPECT_EQ(tanh(one<L>(-HUGE_VAL))[0], -1);
  EXPECT_TRUE(std::isnan(tanh(one<L>(NAN))[0]));
}

TYPED_TEST(FunctionsTest, AsinAndAcosAreWithinThreeUnits) {
  using L = TypeParam;
  using W = Wider<typename L::Constant>;
  EXPECT_LE(this->worst([](const L& x) { return asin(x); }, [](W x) { return std::asin(x); }, -1, 1), 3);
  EXPECT_LE(this->worst([](const L& x) { return acos(x); }, [](W x) { return std::acos(x); }, -1, 1), 3);
  EXPECT_EQ(acos(one<L>(1))[0], 0);
  EXPECT_EQ(acos(one<L>(-1))[0], static_cast<typename L::Constant>(M_PI));
  for (const double outside : {1.01, -1.01, 30.0, HUGE_VAL, -HUGE_VAL, double{NAN}}) {
    EXPECT_TRUE(std::isnan(acos(one<L>(outside))[0])) << outside;
    EXPECT_TRUE(std::isnan(asin(one<L>(outside))[0])) << outside;
  }
}

TYPED_TEST(FunctionsTest, Atan2IsWithinThreeUnitsInAllQuarters) {
  using L = TypeParam;
  using T = typename L::Constant;
  using W = Wider<T>;
  for (const double x : {1.0, -1.0, 0.3, -0.3, 1e-6, -1e-6}) {
    const T at = static_cast<T>(x);
    const auto f = [at](const L& y) { return atan2(y, L(at)); };
    EXPECT_LE(this->worst(
                  f, [at](W y) { return std::atan2(y, W(at)); }, -2, 2),
              3)
        << x;
    const auto g = [at](const L& other) { return atan2(L(at), other); };
    EXPECT_LE(this->worst(
                  g, [at](W other) { return std::atan2(W(at), other); }, -2, 2),
              3)
        << x;
  }
  const double ends[] = {0.0, -0.0, 1, -1, HUGE_VAL, -HUGE_VAL};
  for (const double y : ends) {
    for (const double x : ends) {
      EXPECT_LE(ulps<T>(atan2(one<L>(y), one<L>(x))[0], std::atan2(W(y), W(x))), 1) << y << ' ' << x;
      EXPECT_EQ(std::signbit(atan2(one<L>(y), one<L>(x))[0]), std::signbit(y)) << y << ' ' << x;
    }
    EXPECT_TRUE(std::isnan(atan2(one<L>(NAN), one<L>(y))[0]));
    EXPECT_TRUE(std::isnan(atan2(one<L>(y), one<L>(NAN))[0]));
  }
}

TYPED_TEST(FunctionsTest, SineAndCosineHaveTheStatedAbsoluteError) {
  using L = TypeParam;
  using T = typename L::Constant;
  const double bound = sizeof(T) == 4 ? 3e-7 : 4e-16;
  std::mt19937_64 engine(3);
  std::uniform_real_distribution<double> even(-100, 100);
  double most = 0;
  for (int turn = 0; turn < 4000; ++turn) {
    L x{};
    for (int i = 0; i < L::kLanes; ++i) x.put(i, static_cast<T>(even(engine) / (turn % 2 == 0 ? 1 : 30)));
    for (int i = 0; i < L::kLanes; ++i) {
      most = std::max(most, static_cast<double>(std::abs(sin(x)[i] - std::sin(Wider<T>(x[i])))));
      most = std::max(most, static_cast<double>(std::abs(cos(x)[i] - std::cos(Wider<T>(x[i])))));
    }
  }
  std::printf("[ worst ] %.3g\n", most);
  EXPECT_LE(most, bound);
}

TYPED_TEST(FunctionsTest, FloorIsExact) {
  using L = TypeParam;
  using T = typename L::Constant;
  for (const double a : {0.0,    -0.0,      0.5,       -0.5,       1.0,   -1.0,  2.999,
                         -2.001, 4194304.5, 8388607.5, -8388607.5, 1e9,   -1e9,  4503599627370495.5,
                         1e30,   -1e30,     HUGE_VAL,  -HUGE_VAL,  1e-30, -1e-30}) {
    const T x = static_cast<T>(a);
    EXPECT_EQ(floor(L(x))[0], std::floor(x)) << a;
  }
  EXPECT_TRUE(std::isnan(floor(one<L>(NAN))[0]));
}

}  // namespace
}  // namespace pastern::packed::PASTERN_LANES_SET
