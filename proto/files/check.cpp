// Walks a message by reflection and judges every field by its Rule option.
#include "proto/files/check.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "pastern/v1/rule.pb.h"
#include "proto/files/words.h"

namespace pastern::files {
namespace {

using google::protobuf::FieldDescriptor;
using google::protobuf::Message;
using google::protobuf::Reflection;

// A message that still has to be judged, and where it stands.
struct Pending {
  const Message* message;
  std::string prefix;
};

class Judge {
 public:
  Judge(const std::string& file, Defects& defects) : file_(file), defects_(defects) {}

  // A list of work instead of recursion: a message's own defects first, then those of its parts in file
  // order.
  void run(const Message& root, const std::string& prefix) {
    pending_.push_back({&root, prefix});
    while (!pending_.empty()) {
      const Pending now = pending_.back();
      pending_.pop_back();
      const std::size_t before = pending_.size();
      fields_of(*now.message, now.prefix);
      std::reverse(pending_.begin() + static_cast<std::ptrdiff_t>(before), pending_.end());
    }
  }

 private:
  void fields_of(const Message& message, const std::string& prefix) {
    const auto& descriptor = *message.GetDescriptor();
    for (int i = 0; i < descriptor.field_count(); ++i) {
      const FieldDescriptor& field = *descriptor.field(i);
      const v1::Rule& rule = field.options().GetExtension(v1::rule);
      const std::string path = prefix.empty() ? field.name() : prefix + "." + field.name();
      if (field.is_repeated()) {
        repeated(message, field, rule, path);
      } else {
        singular(message, field, rule, path);
      }
    }
  }

  void repeated(const Message& message, const FieldDescriptor& field, const v1::Rule& rule,
                const std::string& path) {
    const Reflection& reflection = *message.GetReflection();
    const int count = reflection.FieldSize(message, &field);
    const auto items = static_cast<std::uint32_t>(count);
    if (items < rule.min_items() || (rule.max_items() > 0 && items > rule.max_items())) {
      add(path, std::to_string(count) + " entries", counts(rule));
    }
    for (int i = 0; i < count; ++i) {
      const std::string at = path + "[" + std::to_string(i) + "]";
      switch (field.cpp_type()) {
        case FieldDescriptor::CPPTYPE_MESSAGE:
          pending_.push_back({&reflection.GetRepeatedMessage(message, &field, i), at});
          break;
        case FieldDescriptor::CPPTYPE_DOUBLE:
          number(reflection.GetRepeatedDouble(message, &field, i), rule, at);
          break;
        case FieldDescriptor::CPPTYPE_STRING:
          text(reflection.GetRepeatedString(message, &field, i), field, rule, at);
          break;
        default:
          break;  // no text file has other repeated kinds; a test walks every field
      }
    }
  }

  void singular(const Message& message, const FieldDescriptor& field, const v1::Rule& rule,
                const std::string& path) {
    const Reflection& reflection = *message.GetReflection();
    if (!reflection.HasField(message, &field)) {
      if (rule.required()) add(path, "nothing", expected_at_all(field, rule));
      return;
    }
    switch (field.cpp_type()) {
      case FieldDescriptor::CPPTYPE_MESSAGE:
        pending_.push_back({&reflection.GetMessage(message, &field), path});
        break;
      case FieldDescriptor::CPPTYPE_DOUBLE:
        number(reflection.GetDouble(message, &field), rule, path);
        break;
      case FieldDescriptor::CPPTYPE_FLOAT:
        number(static_cast<double>(reflection.GetFloat(message, &field)), rule, path);
        break;
      case FieldDescriptor::CPPTYPE_UINT32:
        number(reflection.GetUInt32(message, &field), rule, path);
        break;
      case FieldDescriptor::CPPTYPE_INT32:
        number(reflection.GetInt32(message, &field), rule, path);
        break;
      case FieldDescriptor::CPPTYPE_UINT64:
        number(static_cast<double>(reflection.GetUInt64(message, &field)), rule, path);
        break;
      case FieldDescriptor::CPPTYPE_INT64:
        number(static_cast<double>(reflection.GetInt64(message, &field)), rule, path);
        break;
      case FieldDescriptor::CPPTYPE_STRING:
        text(reflection.GetString(message, &field), field, rule, path);
        break;
      case FieldDescriptor::CPPTYPE_ENUM:
        choice(reflection.GetEnumValue(message, &field), field, path);
        break;
      case FieldDescriptor::CPPTYPE_BOOL:
        break;
    }
  }

  // Written so that NaN fails.
  void number(double value, const v1::Rule& rule, const std::string& path) {
    const bool low = rule.has_min() && !(value >= rule.min());
    const bool high = rule.has_max() && !(value <= rule.max());
    const bool not_above = rule.has_above() && !(value > rule.above());
    if (!std::isfinite(value) || low || high || not_above) {
      add(path, shown_number(value), range(rule));
    }
  }

  void text(const std::string& value, const FieldDescriptor& field, const v1::Rule& rule,
            const std::string& path) {
    if (rule.required() && value.empty()) add(path, "an empty text", expected_at_all(field, rule));
    if (rule.max_length() > 0 && value.size() > rule.max_length()) {
      add(path, std::to_string(value.size()) + " characters", "at most " + std::to_string(rule.max_length()));
    }
    if (field.type() == FieldDescriptor::TYPE_BYTES) return;
    if (!printable(value, rule.max_length() > kNameLength))
      add(path, "bytes that are no text", "printable text");
  }

  void choice(int value, const FieldDescriptor& field, const std::string& path) {
    const auto* known = field.enum_type()->FindValueByNumber(value);
    if (known == nullptr || value == 0) {
      add(path, known == nullptr ? std::to_string(value) : known->name(), choices(field));
    }
  }

  static std::string choices(const FieldDescriptor& field) {
    std::string list = "one of";
    const auto& kinds = *field.enum_type();
    for (int i = 0; i < kinds.value_count(); ++i) {
      if (kinds.value(i)->number() != 0) list += " " + kinds.value(i)->name();
    }
    return list;
  }

  static std::string counts(const v1::Rule& rule) {
    if (rule.max_items() == 0) return "at least " + std::to_string(rule.min_items()) + " entries";
    return std::to_string(rule.min_items()) + " to " + std::to_string(rule.max_items()) + " entries";
  }

  static std::string range(const v1::Rule& rule) {
    std::string words = "a finite number";
    const char* joint = " ";
    if (rule.has_above()) {
      words += " above " + shown_number(rule.above());
      joint = " and ";
    }
    if (rule.has_min()) {
      words += joint + ("at least " + shown_number(rule.min()));
      joint = " and ";
    }
    if (rule.has_max()) words += joint + ("at most " + shown_number(rule.max()));
    return rule.unit().empty() ? words : words + " (" + rule.unit() + ")";
  }

  static std::string expected_at_all(const FieldDescriptor& field, const v1::Rule& rule) {
    switch (field.cpp_type()) {
      case FieldDescriptor::CPPTYPE_MESSAGE:
        return "a block { ... }";
      case FieldDescriptor::CPPTYPE_STRING:
        return "a text of 1 to " + std::to_string(rule.max_length()) + " characters";
      case FieldDescriptor::CPPTYPE_ENUM:
        return choices(field);
      case FieldDescriptor::CPPTYPE_BOOL:
        return "true or false";
      default:
        return range(rule);
    }
  }

  void add(const std::string& path, const std::string& found, const std::string& expected) {
    defects_.push_back({file_, path, found, expected});
  }

  // Texts up to this length are names and stand on one line; longer ones may have several.
  static constexpr std::uint32_t kNameLength = 100;

  const std::string& file_;
  Defects& defects_;
  std::vector<Pending> pending_;
};

}  // namespace

void check_rules(const Message& message, const std::string& file, const std::string& prefix,
                 Defects& defects) {
  Judge(file, defects).run(message, prefix);
}

}  // namespace pastern::files
