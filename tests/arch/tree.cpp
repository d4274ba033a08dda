// Reads a tree; a small scanner for comments and quotes.
#include "tests/arch/tree.h"

#include <algorithm>
#include <fstream>
#include <regex>
#include <set>
#include <sstream>

namespace pastern::arch {

namespace fs = std::filesystem;

namespace {

std::string read_file(const fs::path& path) {
  std::ostringstream text;
  text << std::ifstream(path, std::ios::binary).rdbuf();
  return text.str();
}

/// Plain names and names with one '*' at the end, as a .gitignore of this project writes them.
bool ignored(const std::vector<std::string>& patterns, const std::string& name) {
  return std::any_of(patterns.begin(), patterns.end(), [&](const std::string& pattern) {
    return pattern.back() == '*' ? name.compare(0, pattern.size() - 1, pattern, 0, pattern.size() - 1) == 0
                                 : name == pattern;
  });
}

std::vector<std::string> ignore_patterns(const fs::path& root) {
  std::vector<std::string> patterns;
  std::ifstream file(root / ".gitignore");
  for (std::string line; std::getline(file, line);) {
    line.erase(std::remove(line.begin(), line.end(), '/'), line.end());
    if (!line.empty() && line[0] != '#' && line[0] != '*') {
      patterns.push_back(line);
    }
  }
  return patterns;
}

std::vector<Include> includes_of(const std::string& text, const std::string& code) {
  static const std::regex kInclude(R"re(^\s*#\s*include\s*(["<])([^">]+)[">])re");
  std::vector<Include> includes;
  std::istringstream lines(text);
  std::istringstream code_lines(code);
  std::string line;
  std::string code_line;
  for (int number = 1; std::getline(lines, line); ++number) {
    std::getline(code_lines, code_line);
    std::smatch match;
    // An include line within a comment or a raw string has nothing left in the code.
    if (code_line.find('#') != std::string::npos && std::regex_search(line, match, kInclude)) {
      includes.push_back({number, match[2], match[1] == "\""});
    }
  }
  return includes;
}

/// One step of the scanner: how far the comment or quote that begins at `at` reaches, or `at` when none does.
std::size_t end_of_hidden(const std::string& text, std::size_t at) {
  const auto reach = [&](const std::string& end, std::size_t from) {
    const std::size_t found = text.find(end, from);
    return found == std::string::npos ? text.size() : found + end.size();
  };
  if (text.compare(at, 2, "//") == 0) {
    return std::min(text.find('\n', at), text.size());
  }
  if (text.compare(at, 2, "/*") == 0) {
    return reach("*/", at + 2);
  }
  if (text.compare(at, 2, "R\"") == 0) {
    const std::size_t open = text.find('(', at);
    return open == std::string::npos ? at : reach(")" + text.substr(at + 2, open - at - 2) + "\"", open);
  }
  const bool digit_separator =
      text[at] == '\'' && at > 0 && std::isxdigit(static_cast<unsigned char>(text[at - 1]));
  if ((text[at] == '"' || text[at] == '\'') && !digit_separator) {
    std::size_t end = at + 1;
    while (end < text.size() && text[end] != text[at] && text[end] != '\n') {
      end += text[end] == '\\' ? 2 : 1;
    }
    return std::min(end + 1, text.size());
  }
  return at;
}

}  // namespace

std::string without_comments(const std::string& text) {
  std::string code = text;
  for (std::size_t at = 0; at < text.size();) {
    const std::size_t end = end_of_hidden(text, at);
    for (std::size_t i = at; i < end; ++i) {
      code[i] = text[i] == '\n' ? '\n' : ' ';
    }
    at = std::max(end, at + 1);
  }
  return code;
}

bool Tree::has(const std::string& path) const { return fs::is_regular_file(root / path); }

Tree read_tree(const fs::path& root) {
  static const std::set<std::string> kSourceEndings{".h", ".hpp", ".cpp", ".cc", ".c"};
  const std::vector<std::string> patterns = ignore_patterns(root);
  Tree tree;
  tree.root = root;
  for (const auto& entry : fs::directory_iterator(root)) {
    const std::string name = entry.path().filename().string();
    if (!ignored(patterns, name)) {
      tree.top.push_back(name);
    }
  }
  std::sort(tree.top.begin(), tree.top.end());
  for (const std::string& name : tree.top) {
    if (name[0] == '.' || !fs::is_directory(root / name)) {
      continue;
    }
    for (const auto& entry : fs::recursive_directory_iterator(root / name)) {
      const fs::path& path = entry.path();
      const bool is_source = kSourceEndings.count(path.extension().string()) > 0;
      const bool is_list = path.filename() == "CMakeLists.txt" || path.extension() == ".cmake";
      if (!entry.is_regular_file() || !(is_source || is_list)) {
        continue;
      }
      Source source;
      source.path = fs::relative(path, root).generic_string();
      source.text = read_file(path);
      if (is_source) {
        source.code = without_comments(source.text);
        source.includes = includes_of(source.text, source.code);
      }
      (is_source ? tree.sources : tree.list_files).push_back(source);
    }
  }
  const auto by_path = [](const Source& a, const Source& b) { return a.path < b.path; };
  std::sort(tree.sources.begin(), tree.sources.end(), by_path);
  std::sort(tree.list_files.begin(), tree.list_files.end(), by_path);
  return tree;
}

}  // namespace pastern::arch
