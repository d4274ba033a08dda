// One pass over the lines of a printed message, with the descriptor of the block that each line stands in.
#include "tests/proto/damage.h"

#include <cmath>
#include <cstdlib>
#include <random>

#include "pastern/v1/rule.pb.h"

namespace pastern::damage {
namespace {

using google::protobuf::Descriptor;
using google::protobuf::FieldDescriptor;

struct Line {
  std::size_t begin;  ///< index of its first line in the file
  std::size_t end;    ///< one past its last line (a block has many)
  const FieldDescriptor* field;
  std::string path;
};

std::vector<std::string> split(const std::string& text) {
  std::vector<std::string> lines;
  std::size_t at = 0;
  while (at < text.size()) {
    const std::size_t end = text.find('\n', at);
    lines.push_back(text.substr(at, end - at));
    at = end == std::string::npos ? text.size() : end + 1;
  }
  return lines;
}

std::string trimmed(const std::string& line) {
  const std::size_t first = line.find_first_not_of(' ');
  return first == std::string::npos ? "" : line.substr(first);
}

std::vector<Line> scan(const std::vector<std::string>& lines, const Descriptor& message) {
  std::vector<Line> found;
  std::vector<std::size_t> open;  // indices into found
  for (std::size_t i = 0; i < lines.size(); ++i) {
    const std::string line = trimmed(lines[i]);
    if (line == "}") {
      found[open.back()].end = i + 1;
      open.pop_back();
      continue;
    }
    const Descriptor& block = open.empty() ? message : *found[open.back()].field->message_type();
    const std::string name = line.substr(0, line.find_first_of(": "));
    const FieldDescriptor* field = block.FindFieldByName(name);
    if (field == nullptr) std::abort();
    const std::string prefix = open.empty() ? "" : found[open.back()].path + ".";
    found.push_back({i, i + 1, field, prefix + name});
    if (line.back() == '{') open.push_back(found.size() - 1);
  }
  return found;
}

std::string joined(const std::vector<std::string>& lines, const Line& where, const std::string& instead) {
  std::string text;
  for (std::size_t i = 0; i < lines.size(); ++i) {
    if (i == where.begin) text += instead + "\n";
    if (i < where.begin || i >= where.end) text += lines[i] + "\n";
  }
  return text;
}

bool is_number(const FieldDescriptor& field) {
  return field.cpp_type() != FieldDescriptor::CPPTYPE_STRING &&
         field.cpp_type() != FieldDescriptor::CPPTYPE_ENUM &&
         field.cpp_type() != FieldDescriptor::CPPTYPE_BOOL &&
         field.cpp_type() != FieldDescriptor::CPPTYPE_MESSAGE;
}

bool is_whole(const FieldDescriptor& field) {
  return is_number(field) && field.cpp_type() != FieldDescriptor::CPPTYPE_DOUBLE &&
         field.cpp_type() != FieldDescriptor::CPPTYPE_FLOAT;
}

bool out_of_range(const FieldDescriptor& field, double value) {
  const v1::Rule& rule = field.options().GetExtension(v1::rule);
  if (std::isnan(value) || std::isinf(value)) return true;
  if (is_whole(field) && (value < 0 || value != std::floor(value))) return true;  // all of ours are unsigned
  if (rule.has_min() && value < rule.min()) return true;
  if (rule.has_max() && value > rule.max()) return true;
  return rule.has_above() && value <= rule.above();
}

class Damager {
 public:
  explicit Damager(const std::vector<std::string>& lines) : lines_(lines) {}

  void damage(const Line& line) {
    const v1::Rule& rule = line.field->options().GetExtension(v1::rule);
    const std::string original = original_of(line);
    const bool one = !line.field->is_repeated();
    put(line, "", " missing", rule.required() && one);
    if (one) put(line, original + "\n" + original, " twice", true);
    put(line, line.field->name() + ":", " without a value", true);
    put(line, line.field->name() + ": }", " closed early", true);
    put(line, "x" + original.substr(original.find_first_not_of(' ')), " by an unknown name", true);
    if (line.field->cpp_type() == FieldDescriptor::CPPTYPE_MESSAGE) {
      block(line);
    } else if (is_number(*line.field)) {
      numbers(line);
    } else {
      words(line);
    }
  }

  std::vector<Damaged> take() { return std::move(out_); }

 private:
  std::string original_of(const Line& line) const {
    std::string text;
    for (std::size_t i = line.begin; i < line.end; ++i) text += lines_[i] + (i + 1 < line.end ? "\n" : "");
    return text;
  }

  void put(const Line& line, const std::string& instead, const std::string& what, bool must_refuse) {
    out_.push_back({line.path + what, joined(lines_, line, instead), must_refuse});
  }
  void value(const Line& line, const std::string& text, bool must_refuse) {
    put(line, line.field->name() + ": " + text, " = " + text.substr(0, 40), must_refuse);
  }

  // An empty block lacks what is required in it; one of ours always requires something.
  void block(const Line& line) {
    put(line, line.field->name() + " { }", " empty", true);
    value(line, "1", true);
    value(line, "\"text\"", true);
    value(line, "nan", true);
    put(line, line.field->name() + " {", " never closed", true);
  }

  void numbers(const Line& line) {
    for (const char* text : {"nan", "-nan", "inf", "-inf", "1e999", "-1e999"}) value(line, text, true);
    for (const char* text : {"-1e-300", "-1", "-0.5", "0", "0.5", "1", "1e6", "1e9", "4294967295",
                             "4294967296", "18446744073709551616", "1e300", "-1e300"}) {
      value(line, text,
            out_of_range(*line.field, std::strtod(text, nullptr)) ||
                (is_whole(*line.field) && std::string(text).find('e') != std::string::npos));
    }
    const v1::Rule& rule = line.field->options().GetExtension(v1::rule);
    const bool whole = is_whole(*line.field);
    const auto beyond = [&](double limit, double direction) {
      const double next = whole ? limit + direction : std::nextafter(limit, direction * INFINITY);
      char text[40];
      std::snprintf(text, sizeof text, "%.17g", next);
      value(line, text, true);
    };
    if (rule.has_min()) beyond(rule.min(), -1);
    if (rule.has_max()) beyond(rule.max(), 1);
    if (rule.has_above()) value(line, std::to_string(rule.above()), true);
    for (const char* text : {"\"1\"", "\"\"", "true", "{ }", "[1, 2]", "WORD", "1 2", "0x", "--1"}) {
      value(line, text, true);
    }
  }

  void words(const Line& line) {
    const v1::Rule& rule = line.field->options().GetExtension(v1::rule);
    const bool is_text = line.field->cpp_type() == FieldDescriptor::CPPTYPE_STRING;
    const bool is_choice = line.field->cpp_type() == FieldDescriptor::CPPTYPE_ENUM;
    for (const char* text : {"nan", "-1", "1e300", "{ }", "WORD", "1.5"}) value(line, text, true);
    value(line, "0", is_text || is_choice);
    value(line, "77", true);
    value(line, "\"\"", !is_text || rule.required());
    value(line, "\"never closed", true);
    value(line, "\"bell \\007\"", true);
    value(line, "\"" + std::string(1U << 16U, 'a') + "\"", true);
    value(line, "\"\xff\xfe\"", true);
    if (is_choice) value(line, line.field->enum_type()->FindValueByNumber(0)->name(), true);
  }

  const std::vector<std::string>& lines_;
  std::vector<Damaged> out_;
};

}  // namespace

std::vector<Damaged> damage_every_field(const std::string& text, const Descriptor& message,
                                        std::set<std::string>& covered) {
  const std::vector<std::string> lines = split(text);
  Damager damager(lines);
  for (const Line& line : scan(lines, message)) {
    covered.insert(line.field->full_name());
    damager.damage(line);
  }
  return damager.take();
}

std::set<std::string> all_fields(const Descriptor& message) {
  std::set<std::string> names;
  std::vector<const Descriptor*> open{&message};
  while (!open.empty()) {
    const Descriptor& block = *open.back();
    open.pop_back();
    for (int i = 0; i < block.field_count(); ++i) {
      names.insert(block.field(i)->full_name());
      if (block.field(i)->message_type() != nullptr) open.push_back(block.field(i)->message_type());
    }
  }
  return names;
}

BinaryTally damage_binary(std::string_view bytes, std::uint64_t seed, int flips,
                          const std::function<bool(const std::string&, bool&)>& accepts) {
  BinaryTally tally;
  const auto attempt = [&](const std::string& damaged) {
    bool said_why = false;
    ++tally.tried;
    if (accepts(damaged, said_why)) {
      ++tally.accepted;
    } else if (!said_why) {
      ++tally.silent;
    }
  };
  for (std::size_t length = 0; length < bytes.size(); ++length) {
    attempt(std::string(bytes.substr(0, length)));
  }
  for (std::size_t more = 1; more <= 64; ++more) attempt(std::string(bytes) + std::string(more, '\0'));
  std::mt19937_64 random(seed);
  for (int i = 0; i < flips; ++i) {
    std::string damaged(bytes);
    const std::uint64_t bit = random() % (8 * bytes.size());
    damaged[bit / 8] = static_cast<char>(static_cast<unsigned char>(damaged[bit / 8]) ^ (1U << (bit % 8)));
    attempt(damaged);
  }
  return tally;
}

}  // namespace pastern::damage
