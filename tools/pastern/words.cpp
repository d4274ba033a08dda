// See words.h.
#include "tools/pastern/words.h"

#include <fmt/format.h>
#include <unistd.h>

#include <algorithm>
#include <cctype>
#include <cmath>
#include <cstdio>

namespace pastern::tools {
namespace {

bool looks_like_number(const std::string& cell) {
  return !cell.empty() &&
         std::any_of(cell.begin(), cell.end(), [](unsigned char c) { return std::isdigit(c); }) &&
         (std::isdigit(static_cast<unsigned char>(cell[0])) || cell[0] == '-' || cell[0] == '+' ||
          cell[0] == '.');
}

/// What a file or a robot wrote must not steer the terminal.
std::string harmless(std::string text) {
  std::replace_if(
      text.begin(), text.end(),
      [](char c) { return c != '\n' && (static_cast<unsigned char>(c) < 0x20 || c == '\x7f'); }, '?');
  return text;
}

std::string padded(const std::string& cell, std::size_t columns, bool right) {
  const std::size_t have = width(cell);
  const std::string space(columns > have ? columns - have : 0, ' ');
  return right ? space + cell : cell + space;
}

}  // namespace

void say(const std::string& line) {
  std::fputs((harmless(line) + "\n").c_str(), stdout);
  std::fflush(stdout);
}

void complain(const std::string& line) {
  std::fputs((harmless(line) + "\n").c_str(), stderr);
  std::fflush(stderr);
}

void suggest(const std::string& command, const std::string& why) {
  say(fmt::format("next: pastern {}   ({})", command, why));
}

bool at_terminal() { return isatty(STDOUT_FILENO) == 1; }
bool can_ask() { return at_terminal() && isatty(STDIN_FILENO) == 1; }

std::size_t width(const std::string& text) {
  return static_cast<std::size_t>(std::count_if(
      text.begin(), text.end(), [](char c) { return (static_cast<unsigned char>(c) & 0xC0U) != 0x80U; }));
}

std::string Table::text(const std::string& indent) const {
  std::vector<std::size_t> columns(head_.size(), 0);
  std::vector<bool> right(head_.size(), !rows_.empty());
  for (std::size_t c = 0; c < head_.size(); ++c) {
    columns[c] = width(head_[c]);
    for (const auto& cells : rows_) {
      if (c >= cells.size()) continue;
      columns[c] = std::max(columns[c], width(cells[c]));
      right[c] = right[c] && (looks_like_number(cells[c]) || cells[c].empty() || cells[c] == "-");
    }
  }
  std::string out;
  const auto put = [&](const std::vector<std::string>& cells) {
    std::string line = indent;
    for (std::size_t c = 0; c < head_.size() && c < cells.size(); ++c) {
      line += (c == 0 ? "" : "  ") + padded(cells[c], columns[c], right[c]);
    }
    out += line.substr(0, line.find_last_not_of(' ') + 1) + "\n";
  };
  put(head_);
  for (const auto& cells : rows_) put(cells);
  return out;
}

std::string bar(double done, double all, int columns) {
  const double share = all > 0 ? std::clamp(done / all, 0.0, 1.0) : 0.0;
  const auto full = static_cast<std::size_t>(std::lround(share * columns));
  return "[" + std::string(full, '=') + std::string(static_cast<std::size_t>(columns) - full, ' ') + "]";
}

std::string duration(double seconds) {
  if (!std::isfinite(seconds) || seconds < 0) return "-";
  const long whole = std::lround(seconds);
  if (whole < 60) return fmt::format("{} s", whole);
  if (whole < 3600) return fmt::format("{} min {:02} s", whole / 60, whole % 60);
  return fmt::format("{} h {:02} min", whole / 3600, whole % 3600 / 60);
}

std::string brief_hash(const std::string& hex) { return hex.empty() ? "-" : hex.substr(0, 12); }

}  // namespace pastern::tools
