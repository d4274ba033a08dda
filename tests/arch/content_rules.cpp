// Rules about what stands in the files: libraries, names, the drives' two ends, what is compiled.
#include <algorithm>
#include <regex>
#include <sstream>

#include "tests/arch/rules.h"

namespace pastern::arch {

namespace {

bool under(const std::string& path, const std::vector<std::string>& folders) {
  return std::any_of(folders.begin(), folders.end(),
                     [&](const std::string& folder) { return path.rfind(folder + "/", 0) == 0; });
}

/// Calls act(line number, line) for every line.
template <class Act>
void for_lines(const std::string& text, Act act) {
  std::istringstream lines(text);
  std::string line;
  for (int number = 1; std::getline(lines, line); ++number) {
    act(number, line);
  }
}

/// A finding for every line of `text` that matches.
void find_lines(const std::string& path, const std::string& text, const std::regex& pattern,
                const std::string& words, Findings& findings) {
  for_lines(text, [&](int number, const std::string& line) {
    std::smatch match;
    if (std::regex_search(line, match, pattern)) {
      findings.push_back(path + ":" + std::to_string(number) + ": found \"" + match[0].str() + "\", " +
                         words);
    }
  });
}

/// Headers of the C++ standard library have no slash and no ending.
bool is_standard(const std::string& path) {
  return path.find('/') == std::string::npos && path.find('.') == std::string::npos;
}

}  // namespace

Findings check_safety_is_standard(const Tree& tree) {
  Findings findings;
  for (const Source& source : tree.sources) {
    if (!under(source.path, {"safety"})) {
      continue;
    }
    for (const Include& include : source.includes) {
      if (!include.quoted && !is_standard(include.path)) {
        findings.push_back(source.path + ":" + std::to_string(include.line) + ": found <" + include.path +
                           ">, expected the C++ standard library only");
      }
    }
  }
  return findings;
}

Findings check_onboard_libraries(const Tree& tree) {
  // Headers of the operating system have no folder or one of these.
  static const std::vector<std::string> kAllowed{"Eigen/",     "google/protobuf/", "sodium/",
                                                 "Random123/", "boost/lockfree/",  "sys/",
                                                 "arpa/",      "netinet/",         "linux/"};
  Findings findings;
  for (const Source& source : tree.sources) {
    if (!under(source.path, {"runtime", "proto", "safety"})) {
      continue;
    }
    for (const Include& include : source.includes) {
      const bool plain = include.path.find('/') == std::string::npos;
      const bool known = std::any_of(kAllowed.begin(), kAllowed.end(), [&](const std::string& start) {
        return include.path.rfind(start, 0) == 0;
      });
      if (!include.quoted && !plain && !known) {
        findings.push_back(source.path + ":" + std::to_string(include.line) + ": found <" + include.path +
                           ">, a library that does not go on the robot");
      }
    }
  }
  return findings;
}

Findings check_nothing_below_sees_above(const Tree& tree) {
  static const std::regex kCode(
      R"(\b(hal_stub|pastern_hal_stub|stub\s*::|tools\s*::|namespace\s+(stub|tools)\b))");
  static const std::regex kList(R"(\b(hal_stub|pastern_hal_stub|pastern_tools)\b|\btools/(?!cmake/))");
  Findings findings;
  const std::vector<std::string> below{"runtime", "safety", "proto"};
  for (const Source& source : tree.sources) {
    if (under(source.path, below)) {
      find_lines(source.path, source.code, kCode, "which is above it", findings);
      for (const Include& include : source.includes) {
        if (under(include.path, {"hal_stub", "tools"})) {
          findings.push_back(source.path + ":" + std::to_string(include.line) + ": found \"" + include.path +
                             "\", which is above it");
        }
      }
    }
  }
  for (const Source& list : tree.list_files) {
    if (under(list.path, below)) {
      find_lines(list.path, list.text, kList, "which is above it", findings);
    }
  }
  return findings;
}

Findings check_one_caller_of_the_table(const Tree& tree) {
  static const std::regex kLoads(R"(\b(dlopen|dlsym|pastern_hal_entry)\s*\()");
  // Loads the library that sees MPI, on the ground. It may know nothing of drives.
  static const std::string kRanks = "tools/packed/ranks.cpp";
  static const std::regex kHal(R"(pastern_hal)");
  Findings callers;
  for (const Source& source : tree.sources) {
    if (under(source.path, {"hal_stub", "tests"}) || source.path == "runtime/hal/pastern_hal.h") {
      continue;
    }
    const bool includes =
        std::any_of(source.includes.begin(), source.includes.end(),
                    [](const Include& include) { return include.path == "runtime/hal/pastern_hal.h"; });
    const bool loads =
        source.path == kRanks ? std::regex_search(source.text, kHal) : std::regex_search(source.code, kLoads);
    if (includes || loads) {
      callers.push_back(source.path);
    }
  }
  if (callers.size() == 1) {
    return {};
  }
  Findings findings{"the C table of drives is called by " + std::to_string(callers.size()) +
                    " files, expected exactly one"};
  findings.insert(findings.end(), callers.begin(), callers.end());
  return findings;
}

Findings check_drive_command(const Tree& tree) {
  // Made: DriveCommand{...}, DriveCommand(...), DriveCommand name; DriveCommand name{...}; or conjured up by
  // a cast. A copy (DriveCommand name = ...), a reference and a function that returns one are not.
  static const std::regex kMade(
      R"(\bDriveCommand\s*(\{|\()|\bDriveCommand\s+\w+\s*(;|\{)|_cast\s*<[^>]*DriveCommand|new\s+[\w:]*DriveCommand)");
  static const std::regex kOwn(R"(class\s+DriveCommand\s*\{|~?DriveCommand\(\)\s*=\s*default)");
  static const std::regex kFriend(R"(\bfriend\b[^;]*;)");
  static const std::regex kGate(R"(^safety/gate\w*\.cpp$)");
  Findings findings;
  for (const Source& source : tree.sources) {
    if (std::regex_search(source.path, kGate) || under(source.path, {"tests/must_not_compile"})) {
      continue;
    }
    std::string code = source.code;
    if (source.path == "safety/frames.h") {
      const std::size_t begin = code.find("class DriveCommand");
      const std::size_t end = begin == std::string::npos ? begin : code.find("\n};", begin);
      const std::string body = begin == std::string::npos ? "" : code.substr(begin, end - begin);
      std::smatch match;
      const auto count =
          std::distance(std::sregex_iterator(body.begin(), body.end(), kFriend), std::sregex_iterator());
      if (count != 1 || !std::regex_search(body, match, kFriend) || match[0] != "friend class Gate;") {
        findings.push_back("safety/frames.h: expected exactly one friend of DriveCommand, the gate");
      }
      code = std::regex_replace(code, kOwn, "");
    }
    find_lines(source.path, code, kMade, "a DriveCommand is made in safety/gate*.cpp only", findings);
  }
  return findings;
}

Findings check_everything_is_compiled(const Tree& tree, const std::string& compile_commands) {
  Findings findings;
  for (const Source& source : tree.sources) {
    if (source.path.size() < 3 || source.path.compare(source.path.size() - 2, 2, ".h") == 0) {
      continue;
    }
    const std::string named = "\"file\": \"" + (tree.root / source.path).string() + "\"";
    bool compiled = compile_commands.find(named) != std::string::npos;
    if (under(source.path, {"tests/must_not_compile"})) {
      // Compiled by the test itself, twice; the list file says so.
      const std::string name = std::filesystem::path(source.path).filename().string();
      compiled =
          compiled || std::any_of(tree.list_files.begin(), tree.list_files.end(), [&](const Source& list) {
            return under(list.path, {"tests/must_not_compile"}) && list.text.find(name) != std::string::npos;
          });
    }
    if (!compiled) {
      findings.push_back(source.path + ": compiled by no target");
    }
  }
  return findings;
}

}  // namespace pastern::arch
