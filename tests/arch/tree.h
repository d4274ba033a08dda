// A source tree as the architecture checks see it: its files, their include lines, their text without
// comments.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace pastern::arch {

struct Include {
  int line{0};
  std::string path;
  bool quoted{false};  ///< "path", else <path>
};

struct Source {
  std::string path;  ///< from the root, with '/'
  std::string text;
  std::string code;  ///< text with comments and what stands in quotes blanked, line by line as before
  std::vector<Include> includes;
};

struct Tree {
  std::filesystem::path root;
  std::vector<std::string> top;    ///< names at the top level, without those that .gitignore names
  std::vector<Source> sources;     ///< .h .hpp .cpp .cc .c, sorted
  std::vector<Source> list_files;  ///< CMakeLists.txt and .cmake
  [[nodiscard]] bool has(const std::string& path) const;
};

[[nodiscard]] Tree read_tree(const std::filesystem::path& root);

/// Blanks comments, strings and characters, raw strings included; line breaks stay. Include lines keep their
/// path.
[[nodiscard]] std::string without_comments(const std::string& text);

}  // namespace pastern::arch
