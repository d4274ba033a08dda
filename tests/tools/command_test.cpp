// The command as a whole: every verb helps, wrong arguments are one line and status 2, what cannot be reached
// is 4.
#include <gtest/gtest.h>

#include <algorithm>

#include "tests/tools/run.h"
#include "tests/tools/scripted_robot.h"
#include "tools/pastern/verb.h"

namespace pastern::testing {
namespace {

std::vector<std::string> verb_names() {
  std::vector<std::string> names;
  for (const auto& verb : tools::all_verbs()) names.emplace_back(verb->name());
  return names;
}

void expect_usage(const std::vector<std::string>& arguments, const std::string& told) {
  const Ran ran = run(arguments);
  EXPECT_EQ(ran.exit, 2);
  EXPECT_EQ(ran.out, "");
  EXPECT_EQ(lines_of(ran.err).size(), 1U) << ran.err;
  EXPECT_NE(ran.err.find(told), std::string::npos) << ran.err;
}

TEST(CommandTest, HelpListsEveryVerbAndEveryExitStatus) {
  const Ran ran = run({"--help"});
  EXPECT_EQ(ran.exit, 0);
  for (const std::string& name : verb_names())
    EXPECT_NE(ran.out.find("\n  " + name + " "), std::string::npos) << name;
  for (const char* status :
       {"   0  ", "   1  ", "   2  ", "   3  ", "   4  ", "   5  ", "   6  ", "  70  "}) {
    EXPECT_NE(ran.out.find(status), std::string::npos) << status;
  }
  EXPECT_NE(ran.out.find("Not a certified safety function"), std::string::npos);
}

TEST(CommandTest, EveryVerbHelpsWithExamplesThatBeginWithItself) {
  for (const std::string& name : verb_names()) {
    const Ran ran = run({name, "--help"});
    EXPECT_EQ(ran.exit, 0) << name;
    EXPECT_EQ(ran.err, "") << name;
    EXPECT_NE(ran.out.find("Examples:\n  pastern " + name), std::string::npos) << ran.out;
  }
}

TEST(CommandTest, VerbsOfTheDayAreThere) {
  const std::vector<std::string> names = verb_names();
  for (const char* name : {"check", "keys", "confirm", "status", "start", "go", "walk", "void", "stop",
                           "halt", "release", "resume", "park", "watch", "report", "adopt"}) {
    EXPECT_NE(std::find(names.begin(), names.end(), name), names.end()) << name;
  }
}

TEST(CommandTest, WrongArgumentsAreOneLineAndStatusTwo) {
  expect_usage({}, "which verb?");
  expect_usage({"chek"}, "no verb 'chek': expected one of check");
  expect_usage({""}, "");
  expect_usage({"--nonsense"}, "nonsense");
  expect_usage({"check"}, "required");
  expect_usage({"status", "--wait", "soon"}, "soon");
  expect_usage({"status", "--wait", "nan"}, "nan");
  expect_usage({"status", "--wait", "-1"}, "expected 0.1 to 600");
  expect_usage({"status", "--port", "0"}, "expected 1 to 65533");
  expect_usage({"status", "--port", "65534"}, "expected 1 to 65533");
  expect_usage({"status", "--port", "7741x"}, "7741x");
  expect_usage({"status", "surplus"}, "surplus");
  expect_usage({"walk", "--seconds", "1e9"}, "expected 0.5 to 60");
  expect_usage({"walk", "--draw", "-3"}, "-3");
  expect_usage({"keys", "steal"}, "steal");
  expect_usage({"keys", "allow", "ida"}, "--may watch or --may command");
  expect_usage({"keys", "make"}, "a NAME");
  expect_usage({"start"}, "plan is required");
  expect_usage({"adopt", "xyz1"}, "expected 4 to 64 digits");
  expect_usage({"adopt", "abcd", "--back"}, "expected one of");
  expect_usage({"report", "--session", "-1"}, "-1");
}

TEST(CommandTest, RobotThatIsNotThereIsStatusFour) {
  const std::string port = std::to_string(silent_port());
  for (const char* verb :
       {"status", "go", "walk", "void", "release", "resume", "park", "watch", "adopt", "report"}) {
    const Ran ran = run({verb, "--port", port, "--keys", "", "--wait", "0.2"});
    EXPECT_EQ(ran.exit, 4) << verb;
    EXPECT_EQ(lines_of(ran.err).size(), 1U) << verb << ": " << ran.err;
    EXPECT_NE(ran.err.find("no answer from 127.0.0.1:" + port), std::string::npos) << ran.err;
  }
}

TEST(CommandTest, StartReadsThePlanBeforeItSpeaksToTheRobot) {
  const Ran missing =
      run({"start", "/no/such.plan.txtpb", "--port", std::to_string(silent_port()), "--keys", ""});
  EXPECT_EQ(missing.exit, 3);
  EXPECT_NE(missing.err.find("/no/such.plan.txtpb"), std::string::npos) << missing.err;
  const std::string plans = std::string(PASTERN_SOURCE_DIR) + "/tools/plans/";
  expect_usage({"start", plans + "offer.plan.txtpb", "--keys", ""}, "--candidate");
  expect_usage({"start", plans + "default.plan.txtpb", "--candidate", "x.policy", "--keys", ""},
               "--candidate");
}

}  // namespace
}  // namespace pastern::testing
