// The command line: every wrong one is one clear line.
#include "runtime/onboard/options.h"

#include <gtest/gtest.h>

#include <vector>

namespace pastern::onboard {
namespace {

std::optional<Options> parse(std::vector<const char*> words, std::string& error) {
  words.insert(words.begin(), "pastern-onboard");
  return parse_options(static_cast<int>(words.size()), words.data(), error);
}

TEST(Options, TakesValuesAfterASpaceOrAnEqualsSign) {
  std::string error;
  const auto options = parse({"--robot", "r", "--hal=h", "--journal", "j", "--pace=stepped", "--seed",
                              "18446744073709551615", "--hal-options", "a=b;c=d", "--cpu", "1"},
                             error);
  ASSERT_TRUE(options) << error;
  EXPECT_EQ(options->robot, "r");
  EXPECT_EQ(options->hal, "h");
  EXPECT_EQ(options->pace, session::Pace::stepped);
  EXPECT_EQ(options->seed, 18446744073709551615ULL);
  EXPECT_EQ(options->hal_options, "a=b;c=d");
  EXPECT_EQ(options->cpu, 1);
  EXPECT_EQ(options->command_port, 7741);
}

TEST(Options, WrongOnesAreOneLineThatNamesThem) {
  const std::vector<std::vector<const char*>> wrong{{"--robot"},
                                                    {"--nonsense", "1"},
                                                    {"stray"},
                                                    {"--pace", "fast"},
                                                    {"--cpu", "-1"},
                                                    {"--cpu", "1x"},
                                                    {"--seed", "-1"},
                                                    {"--command-port", "65536"},
                                                    {"--robot", ""},
                                                    {"--baton-lapse-ms", "99"},
                                                    {"--priority", "0"},
                                                    {"--seed", ""},
                                                    {"--seed", "99999999999999999999999"},
                                                    {"--robot", "r"},
                                                    {"--robot", "r", "--hal", "h"},
                                                    {}};
  for (const auto& words : wrong) {
    std::string error;
    EXPECT_FALSE(parse(words, error));
    EXPECT_FALSE(error.empty());
    EXPECT_EQ(error.find('\n'), std::string::npos) << error;
    EXPECT_NE(error.find(words.empty() ? "--robot" : "expected"), std::string::npos) << error;
  }
}

TEST(Options, HelpShowsEveryOption) {
  std::string error;
  ASSERT_TRUE(parse({"--help"}, error));
  const std::string help = help_text();
  for (const char* name : {"--robot", "--policy", "--hal", "--hal-options", "--journal", "--pace", "--keys",
                           "--host", "--command-port", "--telemetry-port", "--fetch-port", "--baton-lapse-ms",
                           "--cpu", "--priority", "--seed"}) {
    EXPECT_NE(help.find(name), std::string::npos) << name;
  }
}

}  // namespace
}  // namespace pastern::onboard
