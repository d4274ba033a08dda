// What the ground command says: facts to standard output, complaints to standard error, tables that line up.
#pragma once

#include <string>
#include <vector>

namespace pastern::tools {

/// One line to standard output, at once.
void say(const std::string& line);
/// One line to standard error, at once.
void complain(const std::string& line);
/// The last line of a verb: what a human would type next, and why. `pastern` is put before `command`.
void suggest(const std::string& command, const std::string& why);

/// True when a person is at the terminal (standard output is one).
[[nodiscard]] bool at_terminal();
/// True when a person can be asked (standard input and output are a terminal).
[[nodiscard]] bool can_ask();

/// Rows of cells, columns lined up by the widest cell, two spaces between. Cells that look like numbers stand
/// right.
class Table {
 public:
  explicit Table(std::vector<std::string> head) : head_(std::move(head)) {}
  void row(std::vector<std::string> cells) { rows_.push_back(std::move(cells)); }
  [[nodiscard]] std::string text(const std::string& indent = "") const;

 private:
  std::vector<std::string> head_;
  std::vector<std::vector<std::string>> rows_;
};

/// Columns that `text` takes: code points of UTF-8, none of them wide in what we print.
[[nodiscard]] std::size_t width(const std::string& text);
/// "[=======     ]": `done` of `all` in `columns` characters.
[[nodiscard]] std::string bar(double done, double all, int columns);
/// "48 s", "6 min 05 s", "2 h 10 min".
[[nodiscard]] std::string duration(double seconds);
/// First 12 of a hash's hex digits, for people; "-" when empty.
[[nodiscard]] std::string brief_hash(const std::string& hex);

}  // namespace pastern::tools
