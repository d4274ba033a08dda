// See document.h.
#include "tools/report/document.h"

#include <fmt/format.h>

#include <algorithm>
#include <cctype>

#include "tools/pastern/words.h"
#include "tools/report/svg.h"

namespace pastern::tools {
namespace {

constexpr const char* kStyle = R"(
:root { color-scheme: light; }
* { box-sizing: border-box; }
body { margin: 0; background: #fff; color: #1a1a1a; font: 15px/1.5 "DejaVu Sans", "Liberation Sans", Arial, sans-serif; }
main { max-width: 1040px; margin: 0 auto; padding: 28px 28px 60px; }
h1 { font-size: 15px; font-weight: 600; margin: 0 0 14px; color: #4a4a4a; }
.verdict { border: 2px solid #1a1a1a; border-left-width: 14px; padding: 14px 20px 12px; }
.verdict strong { display: block; font-size: 25px; line-height: 1.25; margin-bottom: 6px; }
.verdict p { margin: 4px 0; }
h2 { font-size: 18px; margin: 34px 0 8px; padding-bottom: 4px; border-bottom: 1px solid #9a9a9a; }
p { margin: 8px 0; max-width: 900px; }
.caution { border: 1px solid #1a1a1a; padding: 8px 18px; margin: 18px 0;
  background: repeating-linear-gradient(135deg, #1a1a1a 0 2px, #fff 2px 9px) left / 14px 100% no-repeat; padding-left: 32px; }
.caution p { margin: 5px 0; max-width: none; }
figure { margin: 14px 0 4px; }
figcaption { font-size: 13px; color: #4a4a4a; max-width: 900px; }
svg { display: block; width: 100%; height: auto; font-family: inherit; }
.wide { overflow-x: auto; }
table { border-collapse: collapse; margin: 8px 0; font-variant-numeric: tabular-nums; }
caption { text-align: left; white-space: nowrap; font-size: 13px; color: #4a4a4a; padding-bottom: 4px; }
th, td { padding: 3px 14px 3px 0; text-align: left; vertical-align: top; border-bottom: 1px solid #e0e0e0; }
th { border-bottom: 1px solid #5a5a5a; font-weight: 600; }
.number { text-align: right; white-space: nowrap; }
.long { font-size: 12px; line-height: 1.35; }
.long td, .long th { padding: 1px 10px 1px 0; }
dl { display: grid; grid-template-columns: max-content 1fr; gap: 2px 18px; margin: 8px 0; }
dt { color: #4a4a4a; } dd { margin: 0; overflow-wrap: anywhere; }
ul { margin: 6px 0; padding-left: 20px; }
pre { margin: 0; font: 13px/1.4 "DejaVu Sans Mono", "Liberation Mono", monospace; white-space: pre-wrap; }
@media print { main { max-width: none; padding: 0; } figure, table.short, .verdict { break-inside: avoid; } h2 { break-after: avoid; } }
)";

bool numeric_column(const Block& block, std::size_t column) {
  bool any = false;
  for (const auto& row : block.rows) {
    if (column >= row.size() || row[column].empty() || row[column] == "-") continue;
    const std::string& cell = row[column];
    const bool signed_first = (cell[0] == '-' || cell[0] == '+') && cell.size() > 1;
    if (!std::isdigit(static_cast<unsigned char>(cell[signed_first ? 1 : 0]))) return false;
    any = true;
  }
  return any;
}

std::string html_table(const Block& block) {
  std::string out =
      fmt::format("<div class=\"wide\"><table class=\"{}\">\n", block.long_table ? "long" : "short");
  if (!block.words.empty()) out += "<caption>" + xml(block.words) + "</caption>\n";
  std::vector<std::string> classes;
  for (std::size_t c = 0; c < block.head.size(); ++c) {
    classes.push_back(numeric_column(block, c) ? " class=\"number\"" : "");
  }
  out += "<thead><tr>";
  for (std::size_t c = 0; c < block.head.size(); ++c) {
    out += fmt::format("<th scope=\"col\"{}>{}</th>", classes[c], xml(block.head[c]));
  }
  out += "</tr></thead>\n<tbody>\n";
  for (const auto& row : block.rows) {
    out += "<tr>";
    for (std::size_t c = 0; c < block.head.size(); ++c) {
      out += fmt::format("<td{}>{}</td>", classes[c], c < row.size() ? xml(row[c]) : "");
    }
    out += "</tr>\n";
  }
  return out + "</tbody></table></div>\n";
}

std::string html_value(const std::string& value) {
  return value.find('\n') == std::string::npos ? xml(value) : "<pre>" + xml(value) + "</pre>";
}

std::string html_block(const Block& block) {
  std::string out;
  switch (block.kind) {
    case Block::Kind::section:
      return "<h2>" + xml(block.words) + "</h2>\n";
    case Block::Kind::paragraph:
      return "<p>" + xml(block.words) + "</p>\n";
    case Block::Kind::table:
      return html_table(block);
    case Block::Kind::figure:
      return "<figure>\n" + block.svg + "<figcaption>" + xml(block.words) + "</figcaption>\n</figure>\n";
    case Block::Kind::caution:
      for (const auto& row : block.rows) out += "<p>" + xml(row.at(0)) + "</p>\n";
      return "<div class=\"caution\" role=\"note\">\n" + out + "</div>\n";
    case Block::Kind::list:
      for (const auto& row : block.rows) out += "<li>" + xml(row.at(0)) + "</li>\n";
      return "<ul>\n" + out + "</ul>\n";
    case Block::Kind::pairs:
      for (const auto& row : block.rows)
        out += "<dt>" + xml(row.at(0)) + "</dt><dd>" + html_value(row.at(1)) + "</dd>\n";
      return "<dl>\n" + out + "</dl>\n";
  }
  return out;
}

/// Broken at spaces so that no line is longer than 100.
std::string wrapped(const std::string& words, const std::string& indent) {
  std::string out;
  std::string line;
  std::size_t at = 0;
  while (at < words.size()) {
    const std::size_t end = std::min(words.find(' ', at), words.size());
    const std::string word = words.substr(at, end - at);
    if (!line.empty() && width(line) + 1 + width(word) > 100) {
      out += line + "\n";
      line = indent;
    }
    line += (line.empty() || line == indent ? "" : " ") + word;
    at = end + 1;
  }
  return out + line + "\n";
}

std::string text_pairs(const Block& block) {
  std::size_t widest = 0;
  for (const auto& row : block.rows) widest = std::max(widest, width(row.at(0)));
  std::string out;
  for (const auto& row : block.rows) {
    std::string value = row.at(1);
    const std::string indent(widest + 2, ' ');
    for (std::size_t at = value.find('\n'); at != std::string::npos; at = value.find('\n', at + 1)) {
      value.insert(at + 1, indent);
    }
    out += row.at(0) + std::string(widest + 2 - width(row.at(0)), ' ') + value + "\n";
  }
  return out;
}

std::string text_block(const Block& block) {
  std::string out;
  switch (block.kind) {
    case Block::Kind::section:
      return "\n" + block.words + "\n" + std::string(width(block.words), '-') + "\n";
    case Block::Kind::paragraph:
      return wrapped(block.words, "");
    case Block::Kind::figure:
      return "";
    case Block::Kind::table: {
      Table table(block.head);
      for (const auto& row : block.rows) table.row(row);
      return (block.words.empty() ? "" : wrapped(block.words, "")) + table.text("  ");
    }
    case Block::Kind::caution:
      for (const auto& row : block.rows) out += wrapped("! " + row.at(0), "  ");
      return "\n" + out;
    case Block::Kind::list:
      for (const auto& row : block.rows) out += wrapped("- " + row.at(0), "  ");
      return out;
    case Block::Kind::pairs:
      return text_pairs(block);
  }
  return out;
}

}  // namespace

void Document::figure(const std::string& caption, const std::string& svg) {
  if (svg.empty()) return;
  Block& block = add(Block::Kind::figure);
  block.words = caption;
  block.svg = svg;
}

Block& Document::table(const std::string& caption, std::vector<std::string> head) {
  Block& block = add(Block::Kind::table);
  block.words = caption;
  block.head = std::move(head);
  return block;
}

std::string to_text(const Document& document) {
  std::string out = document.title + "\n\n" + wrapped(document.verdict, "");
  for (const std::string& line : document.lines) out += wrapped(line, "");
  for (const Block& block : document.blocks) out += text_block(block);
  return out;
}

std::string to_html(const Document& document) {
  std::string out = "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n";
  out += "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n";
  out +=
      "<title>" + xml(document.title) + "</title>\n<style>" + kStyle + "</style>\n</head>\n<body>\n<main>\n";
  out += "<h1>" + xml(document.title) + "</h1>\n<div class=\"verdict\">\n<strong>" + xml(document.verdict) +
         "</strong>\n";
  for (const std::string& line : document.lines) out += "<p>" + xml(line) + "</p>\n";
  out += "</div>\n";
  for (const Block& block : document.blocks) out += html_block(block);
  return out + "</main>\n</body>\n</html>\n";
}

}  // namespace pastern::tools
