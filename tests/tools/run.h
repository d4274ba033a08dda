// Runs a verb in this process and keeps what it said.
#pragma once

#include <string>
#include <vector>

namespace pastern::testing {

struct Ran {
  int exit{-1};
  std::string out;  ///< standard output
  std::string err;  ///< standard error
};

[[nodiscard]] Ran run(const std::vector<std::string>& arguments);

/// Lines of `text`, without their ends.
[[nodiscard]] std::vector<std::string> lines_of(const std::string& text);

/// Every number in `text` as it is written, in order.
[[nodiscard]] std::vector<std::string> numbers_in(const std::string& text);

/// What a reader sees of a page: pictures, style and tags taken out, entities put back.
[[nodiscard]] std::string text_of_page(const std::string& html);

}  // namespace pastern::testing
