// One line of text for each defect, whatever bytes the file put into it.
#include "proto/files/defect.h"

namespace pastern::files {
namespace {

// A file may hold anything; a line of ours holds no control characters and no endless text.
constexpr std::size_t kLongest = 200;

std::string shown(const std::string& text) {
  std::string out;
  for (const char c : text) {
    const auto byte = static_cast<unsigned char>(c);
    if (out.size() > kLongest) return out + "...";
    if (byte >= 0x20 && byte != 0x7f) {
      out += c;
    } else if (c == '\n') {
      out += "\\n";
    } else {
      static constexpr char kDigits[] = "0123456789abcdef";
      out += {'\\', 'x', kDigits[byte >> 4], kDigits[byte & 15]};
    }
  }
  return out;
}

}  // namespace

std::string Defect::line() const {
  const std::string place = field.empty() ? "" : ": " + shown(field);
  return shown(file) + place + ": found " + shown(found) + ", expected " + shown(expected);
}

std::string lines(const Defects& defects) {
  std::string all;
  for (const Defect& defect : defects) all += defect.line() + "\n";
  return all;
}

}  // namespace pastern::files
