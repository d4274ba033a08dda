// Lanes do in each lane what a plain number does: arithmetic, comparison, choice, and what is not a number.
#include "tools/packed/lanes.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <type_traits>
#include <vector>

namespace pastern::packed::PASTERN_LANES_SET {
namespace {

template <class L>
class LanesTest : public testing::Test {
 protected:
  using Number = typename L::Constant;
  static constexpr Number kNan = std::numeric_limits<Number>::quiet_NaN();
  static constexpr Number kHuge = std::numeric_limits<Number>::infinity();

  // Numbers that differ from lane to lane, ugly ones among them.
  static L some(int turn) {
    const std::vector<Number> pool = {Number(0), Number(-0.0),  Number(1.5), Number(-2.25), kNan,       kHuge,
                                      -kHuge,    Number(1e-30), Number(7),   Number(-7),    Number(2.5)};
    L lanes{};
    for (int i = 0; i < L::kLanes; ++i) {
      lanes.put(i, pool[static_cast<std::size_t>(i * 5 + turn) % pool.size()]);
    }
    return lanes;
  }
  static void expect_same(Number lane, Number plain) {
    if (std::isnan(plain)) {
      EXPECT_TRUE(std::isnan(lane));
    } else {
      EXPECT_EQ(lane, plain);
      EXPECT_EQ(std::signbit(lane), std::signbit(plain));
    }
  }
};

using Kinds = testing::Types<Lanes<float, 4>, Lanes<float, 8>, Lanes<float, 16>, Lanes<double, 2>,
                             Lanes<double, 4>, Lanes<double, 8>>;
TYPED_TEST_SUITE(LanesTest, Kinds);

TYPED_TEST(LanesTest, ArithmeticIsThatOfPlainNumbersInEachLane) {
  using L = TypeParam;
  using T = typename L::Constant;
  for (int turn = 0; turn < 121; ++turn) {
    const L a = this->some(turn % 11);
    const L b = this->some(turn / 11);
    const L sum = a + b;
    const L difference = a - b;
    const L product = a * b;
    const L ratio = a / b;
    const L mixed = T(3) - a * T(2);
    for (int i = 0; i < L::kLanes; ++i) {
      this->expect_same(sum[i], a[i] + b[i]);
      this->expect_same(difference[i], a[i] - b[i]);
      this->expect_same(product[i], a[i] * b[i]);
      this->expect_same(ratio[i], a[i] / b[i]);
      this->expect_same((-a)[i], -a[i]);
      this->expect_same(mixed[i], T(3) - a[i] * T(2));
      this->expect_same(abs(a)[i], std::abs(a[i]));
      this->expect_same(sqrt(a)[i], std::sqrt(a[i]));
      this->expect_same(min(a, b)[i], std::min(a[i], b[i]));
      this->expect_same(max(a, b)[i], std::max(a[i], b[i]));
    }
  }
}

TYPED_TEST(LanesTest, MasksAreThatOfPlainNumbersInEachLane) {
  using L = TypeParam;
  for (int turn = 0; turn < 121; ++turn) {
    const L a = this->some(turn % 11);
    const L b = this->some(turn / 11);
    int below = 0;
    for (int i = 0; i < L::kLanes; ++i) {
      EXPECT_EQ((a < b)[i], a[i] < b[i]);
      EXPECT_EQ((a > b)[i], a[i] > b[i]);
      EXPECT_EQ((a <= b)[i], a[i] <= b[i]);
      EXPECT_EQ((a >= b)[i], a[i] >= b[i]);
      EXPECT_EQ((a == b)[i], a[i] == b[i]);
      EXPECT_EQ((a != b)[i], a[i] != b[i]);
      EXPECT_EQ(((a < b) & (a < L(0)))[i], a[i] < b[i] && a[i] < 0);
      EXPECT_EQ(((a < b) | (a > L(0)))[i], a[i] < b[i] || a[i] > 0);
      EXPECT_EQ(((a < b) ^ (a > L(0)))[i], (a[i] < b[i]) != (a[i] > 0));
      EXPECT_EQ((!(a < b))[i], !(a[i] < b[i]));
      this->expect_same(select(a < b, a, b)[i], a[i] < b[i] ? a[i] : b[i]);
      below += a[i] < b[i] ? 1 : 0;
    }
    EXPECT_EQ(any(a < b), below > 0);
    EXPECT_EQ(all(a < b), below == L::kLanes);
    EXPECT_EQ(all(!(a < b)), below == 0);
    EXPECT_EQ(count(a < b), below);
    EXPECT_EQ(count(!(a < b)), L::kLanes - below);
  }
}

TYPED_TEST(LanesTest, AMaskOfBitsHasThoseLanes) {
  using Yes = typename TypeParam::Yes;
  for (unsigned bits = 0; bits <= Yes::kAll; bits += 1 + Yes::kAll / 97) {
    EXPECT_EQ(bits_of(Yes::of(bits)), bits);
    for (int i = 0; i < TypeParam::kLanes; ++i) EXPECT_EQ(Yes::of(bits)[i], ((bits >> i) & 1U) != 0);
  }
}

TYPED_TEST(LanesTest, RoundsToTheNearestWholeNumberTiesToEven) {
  using T = typename TypeParam::Constant;
  for (const T a : {T(0.5), T(1.5), T(2.5), T(-0.5), T(-1.5), T(3.4999), T(-7.51), T(1000.5), T(0)}) {
    EXPECT_EQ(round_even(TypeParam(a))[0], std::nearbyint(a)) << a;
  }
}

TYPED_TEST(LanesTest, CountsTheLanesThatAreOutside) {
  using L = TypeParam;
  L a(0);
  EXPECT_EQ(count_outside(a, L(-1), L(1)), 0);
  a.put(0, 2);
  a.put(L::kLanes - 1, -3);
  EXPECT_EQ(count_outside(a, L(-1), L(1)), 2);
  a.put(0, std::numeric_limits<typename L::Constant>::quiet_NaN());
  EXPECT_EQ(count_outside(a, L(-1), L(1)), 1);
  EXPECT_EQ(sum(L(1)), L::kLanes);
}

TYPED_TEST(LanesTest, LanesAreCopiedAsBytesAndZeroWhenAsked) {
  EXPECT_TRUE(std::is_trivially_copyable_v<TypeParam>);
  EXPECT_TRUE(std::is_trivially_default_constructible_v<TypeParam>);
  const TypeParam zero{};
  for (int i = 0; i < TypeParam::kLanes; ++i) EXPECT_EQ(zero[i], 0);
}

}  // namespace
}  // namespace pastern::packed::PASTERN_LANES_SET
