// Drawn sites.
#include "tools/train/sites.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "tests/tools/train/robots.h"

namespace pastern::tools {
namespace {

TEST(DrawnSites, StayInTheirRangesAndFillThem) {
  const auto model = test::model("dunlin12");
  const SiteRanges ranges = wide_ranges();
  double lightest = 9;
  double heaviest = 0;
  int weak = 0;
  constexpr int kCount = 2000;
  for (std::uint64_t i = 0; i < kCount; ++i) {
    const stub::Site site = draw_site(*model, ranges, 1, i);
    const auto inside = [](double value, const Range& range) {
      return value >= range.low && value <= range.high;
    };
    ASSERT_TRUE(inside(site.load_kg, ranges.load_kg));
    ASSERT_TRUE(inside(site.load_at_m[0], ranges.load_x_m));
    ASSERT_TRUE(inside(site.load_at_m[1], ranges.load_y_m));
    ASSERT_TRUE(inside(site.pack_voltage_ratio, ranges.pack_voltage_ratio));
    ASSERT_TRUE(inside(site.friction, ranges.friction));
    ASSERT_TRUE(inside(site.command_delay_s, ranges.command_delay_s));
    ASSERT_TRUE(inside(site.slope_rad, ranges.slope_rad));
    ASSERT_TRUE(inside(site.push_m_per_s, ranges.push_m_per_s));
    lightest = std::min(lightest, site.load_kg);
    heaviest = std::max(heaviest, site.load_kg);
    const double least = *std::min_element(site.strength.begin(), site.strength.begin() + 12);
    ASSERT_GE(least, ranges.strength.low * ranges.weak_strength.low);
    weak += least < ranges.strength.low ? 1 : 0;
  }
  EXPECT_LT(lightest, 0.02);
  EXPECT_GT(heaviest, 4.48);
  // 60 % have a weak joint; s * w < 0.85 with s in 0.85..1.05 and w in 0.5..0.95 in 0.882 of those (integral
  // of (0.85/s - 0.5)/0.45 over s, w capped at 0.95, and the eleven others never): five standard errors.
  const double share = 0.6 * 0.882;
  EXPECT_NEAR(weak / double{kCount}, share, 5 * std::sqrt(share * (1 - share) / kCount) + 0.01);
}

TEST(DrawnSites, AreAFunctionOfSeedAndIndex) {
  const auto model = test::model("dunlin8");
  const stub::Site a = draw_site(*model, wide_ranges(), 1, 7);
  const stub::Site b = draw_site(*model, wide_ranges(), 1, 7);
  const stub::Site c = draw_site(*model, wide_ranges(), 1, 8);
  EXPECT_EQ(a.load_kg, b.load_kg);
  EXPECT_EQ(a.strength, b.strength);
  EXPECT_NE(a.load_kg, c.load_kg);
}

// Common random numbers need it: what one range is must not shift the others.
TEST(DrawnSites, ARangeDoesNotShiftTheDrawsOfAnother) {
  const auto model = test::model("dunlin8");
  SiteRanges narrow = wide_ranges();
  narrow.friction = {0.8, 0.8};
  narrow.weak_share = 0;
  const stub::Site a = draw_site(*model, wide_ranges(), 1, 7);
  const stub::Site b = draw_site(*model, narrow, 1, 7);
  EXPECT_EQ(a.slope_rad, b.slope_rad);
  EXPECT_EQ(a.command_delay_s, b.command_delay_s);
  EXPECT_EQ(b.friction, 0.8);
}

}  // namespace
}  // namespace pastern::tools
