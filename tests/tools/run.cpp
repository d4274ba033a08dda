// See run.h.
#include "tests/tools/run.h"

#include <gtest/gtest.h>

#include <regex>
#include <sstream>

#include "tools/pastern/verb.h"

namespace pastern::testing {

Ran run(const std::vector<std::string>& arguments) {
  ::testing::internal::CaptureStdout();
  ::testing::internal::CaptureStderr();
  Ran ran;
  ran.exit = tools::run_command(arguments);
  ran.out = ::testing::internal::GetCapturedStdout();
  ran.err = ::testing::internal::GetCapturedStderr();
  return ran;
}

std::vector<std::string> lines_of(const std::string& text) {
  std::vector<std::string> lines;
  std::istringstream stream(text);
  for (std::string line; std::getline(stream, line);) lines.push_back(line);
  return lines;
}

std::vector<std::string> numbers_in(const std::string& text) {
  static const std::regex number("[+-]?[0-9]+(\\.[0-9]+)?");
  std::vector<std::string> numbers;
  for (auto at = std::sregex_iterator(text.begin(), text.end(), number); at != std::sregex_iterator(); ++at) {
    numbers.push_back(at->str());
  }
  return numbers;
}

std::string text_of_page(const std::string& html) {
  std::string out;
  std::size_t at = html.find("<body>");
  while (at != std::string::npos && at < html.size()) {
    if (html.compare(at, 4, "<svg") == 0) {
      at = html.find("</svg>", at) + 6;
    } else if (html[at] == '<') {
      at = html.find('>', at) + 1;
      out += ' ';
    } else {
      out += html[at++];
    }
  }
  const std::pair<const char*, const char*> entities[] = {
      {"&lt;", "<"}, {"&gt;", ">"}, {"&quot;", "\""}, {"&amp;", "&"}};
  for (const auto& [entity, sign] : entities) {
    for (std::size_t i = out.find(entity); i != std::string::npos; i = out.find(entity, i + 1)) {
      out.replace(i, std::string(entity).size(), sign);
    }
  }
  return out;
}

}  // namespace pastern::testing
