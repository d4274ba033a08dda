// The strict text parser and the form of a defect.
#include "proto/files/text.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <limits>

#include "proto/files/check.h"
#include "proto/files/plan_file.h"
#include "proto/files/robot_file.h"
#include "proto/files/words.h"
#include "tests/proto/fixture.h"

namespace pastern::files {
namespace {

std::string why(const std::string& text) {
  v1::Plan plan;
  Defects defects;
  return parse_text(text, "a.plan.txtpb", plan, defects) ? "accepted" : lines(defects);
}

TEST(DefectLine, NamesFileFieldFoundAndExpected) {
  EXPECT_EQ((Defect{"x.robot.txtpb", "joints[3].axis", "length 0.5", "a unit vector"}.line()),
            "x.robot.txtpb: joints[3].axis: found length 0.5, expected a unit vector");
  EXPECT_EQ((Defect{"x", "", "a folder", "a file"}.line()), "x: found a folder, expected a file");
}

TEST(DefectLine, StaysOneLineOfBoundedLengthWhateverTheFileHolds) {
  const std::string line = Defect{"x", "a\nb", "\x1b[31m" + std::string(1000, 'y'), "z"}.line();
  EXPECT_EQ(line.find('\n'), std::string::npos);
  EXPECT_EQ(line.find('\x1b'), std::string::npos);
  EXPECT_NE(line.find("a\\nb: found \\x1b[31m"), std::string::npos);
  EXPECT_LT(line.size(), 300U);
}

TEST(TextFile, SoundIsAccepted) { EXPECT_EQ(why(fixture::text(fixture::plan())), "accepted"); }

TEST(TextFile, CommentsAreAllowed) {
  EXPECT_EQ(why("# a remark\n" + fixture::text(fixture::plan())), "accepted");
}

TEST(TextFile, UnknownFieldIsNamedWithLineAndColumn) {
  const std::string sound = fixture::text(fixture::plan());
  const auto line = 1 + std::count(sound.begin(), sound.end(), '\n');
  const std::string text = why(sound + "colour: 3\n");
  EXPECT_EQ(text.rfind("a.plan.txtpb:" + std::to_string(line) + ":", 0), 0U) << text;
  EXPECT_NE(text.find(": colour: found a field of no such name, expected a field of Plan, see "),
            std::string::npos)
      << text;
}

// What the parser says comes in sentences of several forms; every one of ours is a single phrase.
TEST(TextFile, TheParsersSentencesAreToldInTheFormOfADefect) {
  const auto line = [](const std::string& text) { return why(text).substr(0, why(text).find('\n')); };
  EXPECT_EQ(line("name: \"x\"\n\"A\" { }\n"), "a.plan.txtpb:2:5: found \"{\", expected a field's name");
  EXPECT_EQ(line("seed: 3\nseed: 4\n"), "a.plan.txtpb:2:5: seed: found the field twice, expected it once");
  EXPECT_EQ(line("go_by: NOBODY\n"),
            "a.plan.txtpb:2:1: go_by: found \"NOBODY\", expected one of its names, see proto/pastern/v1");
  EXPECT_EQ(line("walk_s: five\n"), "a.plan.txtpb:1:9: found \"five\", expected a number");
  EXPECT_EQ(line("name \"x\""), "a.plan.txtpb:1:6: found \"x\", expected \":\"");
  for (const char* text : {"name: 3\n", "walk_s: five\n", "seed: -1\n", "seed: 99999999999999999999999\n",
                           "name: \"x\n", "{", "}", "adaptation {", "adaptation: 3", "adaptation { kind: }",
                           "name \"x\"", "\"A\".", "seed: 0x", "# \n@"}) {
    const std::string told = why(text);
    EXPECT_NE(told.find("found "), std::string::npos) << told;
    for (const char* ugly : {"., expected", "\"., ", ".., ", ".\"\n", "found Expected", "got:", "found , "}) {
      EXPECT_EQ(told.find(ugly), std::string::npos) << ugly << " in " << told;
    }
  }
}

TEST(TextFile, AFieldSaidTwiceIsRefused) {
  EXPECT_NE(why(fixture::text(fixture::plan()) + "seed: 3\n").find("seed: found the field twice"),
            std::string::npos);
}

TEST(TextFile, EmptyNamesEveryRequiredFieldInOneLineEach) {
  const std::string text = why("");
  EXPECT_EQ(std::count(text.begin(), text.end(), '\n'), 12) << text;
  EXPECT_NE(
      text.find(
          "a.plan.txtpb: walk_s: found nothing, expected a finite number at least 0.5 and at most 60 (s)\n"),
      std::string::npos)
      << text;
  EXPECT_NE(text.find("a.plan.txtpb: go_by: found nothing, expected one of OPERATOR AUTO\n"),
            std::string::npos)
      << text;
}

TEST(TextFile, AnEnumOutsideItsValuesIsRefusedAlsoByNumber) {
  v1::Plan plan = fixture::plan();
  plan.set_go_by(static_cast<v1::Plan::GoBy>(9));
  EXPECT_NE(why(fixture::text(plan)).find("go_by: found 9, expected one of OPERATOR AUTO"),
            std::string::npos);
}

TEST(TextFile, GarbageAndAWholeBinaryFileAreRefusedWithFewLines) {
  std::string garbage;
  for (int i = 0; i < 100'000; ++i) garbage += static_cast<char>(i * 7 + i / 251);
  const std::string text = why(garbage);
  EXPECT_NE(text, "accepted");
  EXPECT_LE(std::count(text.begin(), text.end(), '\n'), 50);
}

TEST(TextFile, DeepNestingIsRefusedWithoutACrash) {
  std::string deep;
  for (int i = 0; i < 200'000; ++i) deep += "adaptation {";
  EXPECT_NE(why(deep), "accepted");
}

TEST(TextFile, LargerThanSixteenMebibytesIsRefused) {
  EXPECT_NE(why(std::string((16U << 20U) + 1, '#')).find("more than 16 MiB"), std::string::npos);
}

TEST(TextFile, DefectsAreAppendedAndNeverRemoved) {
  Defects defects{{"earlier", "", "x", "y"}};
  v1::Plan plan;
  EXPECT_FALSE(parse_text("seed: nan", "b", plan, defects));
  EXPECT_TRUE(parse_text(fixture::text(fixture::plan()), "c", plan, defects));
  EXPECT_EQ(defects[0].file, "earlier");
  EXPECT_GE(defects.size(), 2U);
}

// RFC 3629: overlong forms, surrogates, beyond U+10FFFF and cut sequences are not UTF-8.
TEST(PrintableText, IsWellFormedUtf8WithoutControlCharacters) {
  EXPECT_TRUE(printable("robot 12, \xc3\xa9 \xe2\x82\xac \xf0\x9f\x90\x95", false));
  EXPECT_TRUE(printable("", false));
  for (const char* text : {"\xc0\xaf", "\xe0\x9f\xbf", "\xed\xa0\x80", "\xf4\x90\x80\x80", "\xf5\x80\x80\x80",
                           "\xe2\x82", "\x80", "\xff", "a\x7f", "\x1b[0m", "\xc2\x85", "\t"}) {
    EXPECT_FALSE(printable(text, true)) << hex(std::string_view(text));
  }
  EXPECT_TRUE(printable("a\nb", true));
  EXPECT_FALSE(printable("a\nb", false));
}

TEST(ShownNumber, IsShortAndExact) {
  EXPECT_EQ(shown_number(0.0005), "0.0005");
  EXPECT_EQ(shown_number(0.1), "0.1");
  EXPECT_EQ(shown_number(-3), "-3");
  EXPECT_EQ(shown_number(std::numeric_limits<double>::quiet_NaN()), "nan");
}

TEST(Rules, DefectsOfNestedAndRepeatedFieldsCarryTheirPath) {
  v1::Robot robot = fixture::robot();
  robot.mutable_joints(3)->mutable_drive()->set_peak_torque_nm(-1);
  robot.mutable_joints(3)->mutable_link()->mutable_inertia()->clear_zz();
  Defects defects;
  check_rules(robot, "r", "robot", defects);
  ASSERT_EQ(defects.size(), 2U) << lines(defects);
  EXPECT_EQ(defects[0].field, "robot.joints[3].link.inertia.zz");
  EXPECT_EQ(defects[1].line(),
            "r: robot.joints[3].drive.peak_torque_nm: found -1, expected a finite number above 0 and at most "
            "2000 (N m)");
}

TEST(Rules, CountsOfRepeatedFieldsAreKept) {
  v1::Robot robot = fixture::robot();
  while (robot.joints_size() < 33) *robot.add_joints() = robot.joints(0);
  robot.clear_legs();
  Defects defects;
  check_rules(robot, "r", "", defects);
  EXPECT_EQ(lines(defects),
            "r: joints: found 33 entries, expected 2 to 32 entries\n"
            "r: legs: found 0 entries, expected 2 to 8 entries\n");
}

}  // namespace
}  // namespace pastern::files
