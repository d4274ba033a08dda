// Names and units of causes.
#include <gtest/gtest.h>

#include <set>
#include <string>

#include "safety/trip.h"

namespace pastern::safety {
namespace {

TEST(Causes, EachHasANameOfItsOwnInTheFormOfRobotFiles) {
  std::set<std::string> names;
  for (int c = 0; c < kCauseCount; ++c) {
    const std::string text = name(static_cast<Cause>(c));
    EXPECT_TRUE(names.insert(text).second) << text;
    EXPECT_EQ(text.find_first_not_of("abcdefghijklmnopqrstuvwxyz_"), std::string::npos) << text;
  }
  EXPECT_STREQ(name(Cause::operator_stop), "operator_stop");
  EXPECT_STREQ(name(Cause::internal_stop), "internal_stop");
  EXPECT_STREQ(name(Cause::frame_jump), "frame_jump");
  EXPECT_STREQ(unit(Cause::measured_torque), "N m");
  EXPECT_STREQ(unit(Cause::winding_temperature), "deg C");
  EXPECT_STREQ(unit(Cause::tick_overrun), "s");
}

TEST(Causes, ValuesOutsideTheListsHaveANameToo) {
  EXPECT_STREQ(name(static_cast<Cause>(200)), "unknown");
  EXPECT_STREQ(unit(static_cast<Cause>(200)), "");
  EXPECT_STREQ(name(static_cast<Reaction>(9)), "unknown");
  EXPECT_STREQ(name(static_cast<Phase>(9)), "unknown");
  EXPECT_STREQ(name(static_cast<Hold>(9)), "unknown");
  EXPECT_STREQ(name(Reaction::ramp_down), "ramp_down");
  EXPECT_STREQ(name(Phase::lowering), "lowering");
  EXPECT_STREQ(name(Hold::pack_floor), "pack_floor");
}

}  // namespace
}  // namespace pastern::safety
