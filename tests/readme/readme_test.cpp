// The README is executed: its commands exist, the CI runs its test command, and every other command is run
// here.
#include <gtest/gtest.h>
#include <sys/wait.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <regex>
#include <set>
#include <sstream>
#include <string>
#include <vector>

namespace {

const std::string kRoot = PASTERN_SOURCE_DIR;
const std::string kTestCommand = "sh tests/run.sh";

std::string read(const std::string& path) {
  std::ifstream in(path);
  EXPECT_TRUE(in.good()) << path;
  std::stringstream text;
  text << in.rdbuf();
  return text.str();
}

/// Lines of the fenced blocks marked `sh`, without comments and empty lines.
std::vector<std::string> commands_of(const std::string& markdown) {
  std::vector<std::string> commands;
  std::istringstream lines(markdown);
  bool inside = false;
  for (std::string line; std::getline(lines, line);) {
    if (line.rfind("```", 0) == 0) {
      inside = !inside && line == "```sh";
    } else if (inside && !line.empty() && line[0] != '#') {
      commands.push_back(line.substr(0, line.find("  #")));
    }
  }
  return commands;
}

/// Runs at the project's root with the built programs first in the path, on ports that the other tests leave
/// alone; output goes to `log`.
int run(const std::string& command, const std::string& log) {
  const std::string whole = "cd '" + kRoot + "' && PASTERN_PORT=17741 PATH='" +
                            std::string(PASTERN_BINARY_DIR) + "/bin':$PATH " + command + " >'" + log +
                            "' 2>&1 </dev/null";
  const int status = std::system(whole.c_str());
  return WIFEXITED(status) ? WEXITSTATUS(status) : 128;
}

TEST(Readme, BeginsWithTheDryRunAndTheTestCommand) {
  const auto commands = commands_of(read(kRoot + "/README.md"));
  ASSERT_GE(commands.size(), 2u);
  EXPECT_EQ(commands[0], "sh tools/dry-run.sh");
  EXPECT_EQ(commands[1], kTestCommand);
}

TEST(Readme, TestCommandIsWhatCiRuns) {
  std::istringstream lines(read(kRoot + "/.ci/run"));
  std::string last;
  for (std::string line; std::getline(lines, line);) {
    if (!line.empty() && line[0] != '#') last = line;
  }
  EXPECT_EQ(last, kTestCommand);
}

TEST(Readme, EveryVerbItNamesExists) {
  const std::string readme = read(kRoot + "/README.md");
  const std::regex named("`pastern ([a-z]+)");
  std::set<std::string> verbs;
  for (std::sregex_iterator at(readme.begin(), readme.end(), named), end; at != end; ++at)
    verbs.insert((*at)[1]);
  ASSERT_GE(verbs.size(), 5u);
  for (const std::string& verb : verbs) {
    const std::string log = testing::TempDir() + "readme_verb.log";
    EXPECT_EQ(run("pastern " + verb + " --help", log), 0) << verb << ": " << read(log);
  }
}

TEST(Readme, EveryFileItNamesExists) {
  const std::string readme = read(kRoot + "/README.md");
  const std::regex named("`((?:safety|proto|runtime|hal_stub|tests|tools)/[A-Za-z0-9_./-]*)`");
  int count = 0;
  for (std::sregex_iterator at(readme.begin(), readme.end(), named), end; at != end; ++at, ++count) {
    EXPECT_TRUE(std::filesystem::exists(kRoot + "/" + (*at)[1].str())) << (*at)[1];
  }
  EXPECT_GE(count, 5);
}

TEST(Readme, EveryCommandButTheTestCommandRuns) {
  for (const std::string& command : commands_of(read(kRoot + "/README.md"))) {
    if (command.rfind("sh tests/", 0) == 0) continue;
    const std::string log = testing::TempDir() + "readme_command.log";
    // The dry run may end with the verdict "keep" (1): that is an answer, not a failure.
    const int status = run(command, log);
    EXPECT_TRUE(status == 0 || status == 1) << command << " ended with " << status << "\n" << read(log);
  }
}

TEST(Readme, ReadsCommandsOnlyFromMarkedBlocks) {
  EXPECT_EQ(commands_of("```sh\n# why\nsh a.sh --x  # note\n\n```\n```\nnot this\n```\n"),
            std::vector<std::string>{"sh a.sh --x"});
}

}  // namespace
