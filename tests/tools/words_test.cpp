// Tables, durations, progress and JSON as people and programs read them.
#include "tools/pastern/words.h"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>

#include "pastern/v1/link.pb.h"
#include "tests/tools/run.h"
#include "tools/pastern/follow.h"
#include "tools/pastern/json.h"
#include "tools/report/changes.h"
#include "tools/report/svg.h"

namespace pastern::testing {
namespace {

using namespace tools;

TEST(WordsTest, ColumnsLineUpAndNumbersStandRight) {
  Table table({"name", "value"});
  table.row({"a", "1.5"});
  table.row({"l\xc3\xa4nger", "-120"});
  EXPECT_EQ(table.text(), "name    value\na         1.5\nl\xc3\xa4nger   -120\n");
}

TEST(WordsTest, DurationsAreReadable) {
  EXPECT_EQ(duration(0), "0 s");
  EXPECT_EQ(duration(59.4), "59 s");
  EXPECT_EQ(duration(59.6), "1 min 00 s");
  EXPECT_EQ(duration(365), "6 min 05 s");
  EXPECT_EQ(duration(7800), "2 h 10 min");
  EXPECT_EQ(duration(-1), "-");
  EXPECT_EQ(duration(std::numeric_limits<double>::quiet_NaN()), "-");
}

TEST(WordsTest, BarIsAlwaysAsWideAsAsked) {
  EXPECT_EQ(bar(0, 10, 10), "[          ]");
  EXPECT_EQ(bar(5, 10, 10), "[=====     ]");
  EXPECT_EQ(bar(20, 10, 10), "[==========]");
  EXPECT_EQ(bar(1, 0, 10), "[          ]");
}

TEST(WordsTest, ProgressForetellsFromThePaceSinceItBeganToWatch) {
  Progress progress;
  const Progress::Clock::time_point start{};
  progress.update(40, 100, start);
  EXPECT_FALSE(progress.seconds_to_go().has_value());
  progress.update(50, 100, start + std::chrono::seconds(20));  // 2 s a walk
  EXPECT_DOUBLE_EQ(progress.seconds_to_go().value(), 100);
  EXPECT_NE(progress.line().find("50 of 100 walks, about 1 min 40 s to go"), std::string::npos);
  progress.update(3, 100, start + std::chrono::seconds(30));  // another session
  EXPECT_EQ(progress.line().find("-"), std::string::npos);
}

TEST(WordsTest, TimeToGoStandsStillWhileTheSessionWaitsForAPerson) {
  Progress progress;
  const auto at = [](int seconds) { return Progress::Clock::time_point{} + std::chrono::seconds(seconds); };
  progress.update(0, 10, at(0));
  progress.update(2, 10, at(10), true);  // 5 s a walk; now it waits for go
  const double left = progress.seconds_to_go().value();
  EXPECT_DOUBLE_EQ(left, 40);
  for (int seconds = 11; seconds < 600; seconds += 7) {
    progress.update(2, 10, at(seconds), true);
    EXPECT_DOUBLE_EQ(progress.seconds_to_go().value(), left) << seconds;
  }
  progress.update(2, 10, at(600), false);  // go
  EXPECT_DOUBLE_EQ(progress.seconds_to_go().value(), left);
  progress.update(2, 10, at(603), false);  // walks, and the estimate does not creep up meanwhile
  EXPECT_DOUBLE_EQ(progress.seconds_to_go().value(), left);
  progress.update(3, 10, at(605), true);
  EXPECT_NEAR(progress.seconds_to_go().value(), 35, 1);
}

TEST(WordsTest, DrivesAreNamedAndASimulatedSiteToo) {
  EXPECT_EQ(drives_words(true, "simulated robot", "scenario=hal_stub/scenarios/wet_ramp.scenario.txtpb"),
            "simulated robot, site wet_ramp");
  EXPECT_EQ(drives_words(true, "puppet", "start=1;scenario=mine.txtpb"),
            "simulated robot (puppet), site mine.txtpb");
  EXPECT_EQ(drives_words(true, "simulated robot", "socket=/run/x"),
            "simulated robot, site not named in its settings");
  EXPECT_EQ(drives_words(false, "ring bus", "scenario=x"), "real drives (ring bus)");
  EXPECT_EQ(drives_words(false, "", ""), "real drives");
  EXPECT_EQ(site_of("scenario="), "");
}

TEST(WordsTest, StatusHasATableOfJointsThatLinesUp) {
  v1::Status status;
  status.set_robot("dunlin12");
  status.set_ticks(1);
  status.set_pack_voltage_v(25.25);
  status.set_pack_current_a(3.5);
  for (const char* name : {"front_left_hip", "knee"}) {
    v1::JointStatus& joint = *status.add_joints();
    joint.set_name(name);
    joint.set_angle_rad(std::string(name) == "knee" ? -1.5 : std::nan(""));
    joint.set_winding_c(31.25);
  }
  status.mutable_joints(1)->set_target_rad(-1.25);
  const std::string text = status_text(status);
  EXPECT_NE(text.find("pack        25.2 V, 3.5 A\n"), std::string::npos) << text;
  EXPECT_NE(text.find("joint           angle rad  target rad  winding C\n"
                      "front_left_hip          -           -       31.2\n"
                      "knee               -1.500      -1.250       31.2\n"),
            std::string::npos)
      << text;
}

TEST(WordsTest, WalkThatNeverBeganHasNoFigures) {
  v1::Episode episode;
  episode.set_walk(5);
  episode.set_outcome(v1::VOID);
  episode.set_void_reason("tripped before the walk");
  EXPECT_EQ(walk_line(episode).find("0.00"), std::string::npos);
  EXPECT_NE(walk_line(episode).find("tripped before the walk"), std::string::npos);
}

TEST(JsonTest, TextIsEscapedByRfc8259) { EXPECT_EQ(json("a\"b\\c\n\x01"), "\"a\\\"b\\\\c\\u000a\\u0001\""); }

TEST(JsonTest, NumbersReadBackAndWhatIsNoNumberIsNull) {
  EXPECT_EQ(std::stod(json(0.1)), 0.1);
  EXPECT_EQ(json(std::numeric_limits<double>::infinity()), "null");
  EXPECT_EQ(json(std::nan("")), "null");
  EXPECT_EQ(json(std::uint64_t{18446744073709551615U}), "18446744073709551615");
}

TEST(JsonTest, MessagesKeepTheirFieldNamesAndBytesAreHex) {
  v1::Command command;
  command.set_id("x");
  command.mutable_adopt()->set_policy_sha256(std::string("\x01\xff", 2));
  EXPECT_EQ(
      json(command),
      "{\"format\": 0, \"id\": \"x\", \"operator_name\": \"\", \"baton\": 0, \"adopt\": {\"policy_sha256\": "
      "\"01ff\", \"back\": false}}");
}

TEST(SvgTest, StepsOfAxesAreOneTwoFive) {
  EXPECT_DOUBLE_EQ(tick_step({0, 10}, 10), 1);
  EXPECT_DOUBLE_EQ(tick_step({0, 10}, 9), 2);
  EXPECT_DOUBLE_EQ(tick_step({0, 0.7}, 2), 0.5);
  EXPECT_DOUBLE_EQ(tick_step({-300, 300}, 6), 100);
}

TEST(SvgTest, PlotMapsTheEndsOfItsRangesAndClipsWhatIsBeyond) {
  Sheet sheet(100, 100, "t");
  const Plot plot(sheet, {10, 20}, 50, 60, {0, 5}, {-1, 1});
  EXPECT_DOUBLE_EQ(plot.x(0), 10);
  EXPECT_DOUBLE_EQ(plot.x(5), 60);
  EXPECT_DOUBLE_EQ(plot.y(1), 20);
  EXPECT_DOUBLE_EQ(plot.y(-1), 80);
  EXPECT_DOUBLE_EQ(plot.y(-9), 80);
  EXPECT_DOUBLE_EQ(plot.y(std::nan("")), 80);
}

TEST(ChangesTest, ParametersAreNamedByOutputAndChannelAndNormsAreEuclids) {
  v1::Policy policy;
  policy.add_channels()->set_kind(v1::Channel::PITCH);
  v1::Channel& joint = *policy.add_channels();
  joint.set_kind(v1::Channel::JOINT_OFFSET);
  joint.set_joint("rear_left_knee");
  v1::Layer& hidden = *policy.add_layers();
  hidden.set_outputs(3);
  hidden.set_inputs(2);
  hidden.set_has_bias(true);
  v1::Layer& last = *policy.add_layers();
  last.set_outputs(2);
  last.set_inputs(3);
  policy.add_legs()->set_leg("left");
  EXPECT_EQ(parameter_name(policy, 1), "layer 1 unit 1 <- rear_left_knee offset");
  EXPECT_EQ(parameter_name(policy, 4), "layer 1 unit 3 <- pitch");
  EXPECT_EQ(parameter_name(policy, 7), "layer 1 unit 2 <- bias");
  EXPECT_EQ(parameter_name(policy, 9), "left leg angle <- layer 1 unit 1");
  EXPECT_EQ(parameter_name(policy, 14), "left leg length <- layer 1 unit 3");
  EXPECT_EQ(parameter_name(policy, 15), "parameter 15");

  Parameters from(15, 0.0);
  from[0] = 3;
  from[1] = 4;
  Parameters to = from;
  to[14] = -1;
  to[3] = 0.5;
  const auto groups = group_changes(policy, from, to);
  ASSERT_EQ(groups.size(), 1U);
  EXPECT_DOUBLE_EQ(groups[0].start_norm, 5);
  EXPECT_DOUBLE_EQ(groups[0].change_norm, std::sqrt(1.25));
  const auto largest = largest_changes(policy, from, to, 10);
  ASSERT_EQ(largest.size(), 2U);
  EXPECT_EQ(largest[0].name, "left leg length <- layer 1 unit 3");
  EXPECT_DOUBLE_EQ(largest[0].to, -1);
}

}  // namespace
}  // namespace pastern::testing
