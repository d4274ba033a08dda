// A report as blocks, so that text and HTML tell the same facts: both are written from this, and only from
// this.
#pragma once

#include <string>
#include <vector>

namespace pastern::tools {

struct Block {
  enum class Kind { section, paragraph, caution, table, list, figure, pairs } kind{Kind::paragraph};
  std::string words;                           ///< section, paragraph; caption of a figure or table
  std::vector<std::string> head;               ///< table
  std::vector<std::vector<std::string>> rows;  ///< table; list and caution: one cell a row; pairs: two
  std::string svg;         ///< figure; text leaves figures out, their facts stand in tables
  bool long_table{false};  ///< smaller type on the page
};

struct Document {
  std::string title;
  std::string verdict;             ///< the first words of the page
  std::vector<std::string> lines;  ///< what the verdict rests on, one sentence each
  std::vector<Block> blocks;

  void section(const std::string& words) { add(Block::Kind::section).words = words; }
  void paragraph(const std::string& words) { add(Block::Kind::paragraph).words = words; }
  /// Nothing is added for an empty picture.
  void figure(const std::string& caption, const std::string& svg);
  Block& table(const std::string& caption, std::vector<std::string> head);
  Block& list() { return add(Block::Kind::list); }
  Block& cautions() { return add(Block::Kind::caution); }
  Block& pairs() { return add(Block::Kind::pairs); }

 private:
  Block& add(Block::Kind kind) {
    blocks.emplace_back();
    blocks.back().kind = kind;
    return blocks.back();
  }
};

[[nodiscard]] std::string to_text(const Document& document);
/// One self-contained page: no script, no link, no picture from elsewhere.
[[nodiscard]] std::string to_html(const Document& document);

}  // namespace pastern::tools
