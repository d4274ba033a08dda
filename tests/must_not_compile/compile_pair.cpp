// Compiles one source twice: as it is it must compile; with -DOFFENDING it must not, every error must point
// into that source, and one must be for the stated reason.
//   compile_pair "REGEX of the reason" SOURCE COMPILER ARGUMENT...
#include <sys/wait.h>

#include <array>
#include <cstdio>
#include <regex>
#include <sstream>
#include <string>

namespace {

struct Run {
  int status{-1};
  std::string output;
};

std::string quoted(const std::string& word) {
  std::string text = "'";
  for (const char letter : word) {
    text += letter == '\'' ? std::string("'\\''") : std::string(1, letter);
  }
  return text + "'";
}

Run run(const std::string& command) {
  Run result;
  FILE* pipe = popen((command + " 2>&1").c_str(), "r");
  if (pipe == nullptr) {
    return result;
  }
  std::array<char, 4096> buffer{};
  while (const std::size_t count = fread(buffer.data(), 1, buffer.size(), pipe)) {
    result.output.append(buffer.data(), count);
  }
  const int status = pclose(pipe);
  result.status = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
  return result;
}

/// Empty when the output holds errors in `source` only and one for the reason.
std::string judged(const std::string& output, const std::string& source, const std::regex& reason) {
  static const std::regex kError(R"(^([^:]+):\d+:\d+: (fatal )?error: (.*)$)");
  bool stated = false;
  int errors = 0;
  std::istringstream lines(output);
  for (std::string line; std::getline(lines, line);) {
    std::smatch match;
    if (std::regex_match(line, match, kError)) {
      ++errors;
      if (match[1] != source || match[2].length() > 0) {
        return "an error that is not of the offending line: " + line;
      }
      stated = stated || std::regex_search(line, reason);
    }
  }
  if (errors == 0) {
    return "the compiler gave no error";
  }
  return stated ? "" : "it fails, but not for the stated reason";
}

}  // namespace

int main(int argc, char** argv) {
  if (argc < 4) {
    std::fprintf(stderr, "usage: compile_pair REASON SOURCE COMPILER ARGUMENT...\n");
    return 2;
  }
  const std::string source = argv[2];
  std::string command = "LC_ALL=C";
  for (int i = 3; i < argc; ++i) {
    command += " " + quoted(argv[i]);
  }
  const Run sound = run(command + " " + quoted(source));
  if (sound.status != 0) {
    std::fprintf(stderr, "without the offending line it must compile:\n%s", sound.output.c_str());
    return 1;
  }
  const Run offending = run(command + " -DOFFENDING " + quoted(source));
  const std::string wrong = offending.status == 0 ? "the offending line compiles"
                                                  : judged(offending.output, source, std::regex(argv[1]));
  if (!wrong.empty()) {
    std::fprintf(stderr, "%s\n%s", wrong.c_str(), offending.output.c_str());
    return 1;
  }
  return 0;
}
