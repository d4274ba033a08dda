// See json.h.
#include "tools/pastern/json.h"

#include <fmt/format.h>

#include <cmath>

#include "proto/files/sha256.h"

namespace pastern::tools {
namespace {

using google::protobuf::FieldDescriptor;
using google::protobuf::Message;
using google::protobuf::Reflection;

/// `index` -1: a singular field. Messages nest no deeper than our .proto files do.
// NOLINTNEXTLINE(misc-no-recursion): a tree is walked; see above.
std::string value_of(const Message& m, const Reflection& r, const FieldDescriptor* f, int index) {
  const bool one = index < 0;
  switch (f->cpp_type()) {
    case FieldDescriptor::CPPTYPE_DOUBLE:
      return json(one ? r.GetDouble(m, f) : r.GetRepeatedDouble(m, f, index));
    case FieldDescriptor::CPPTYPE_FLOAT: {
      const float x = one ? r.GetFloat(m, f) : r.GetRepeatedFloat(m, f, index);
      return std::isfinite(x) ? fmt::format("{}", x) : "null";
    }
    case FieldDescriptor::CPPTYPE_BOOL:
      return json(one ? r.GetBool(m, f) : r.GetRepeatedBool(m, f, index));
    case FieldDescriptor::CPPTYPE_INT32:
      return fmt::format("{}", one ? r.GetInt32(m, f) : r.GetRepeatedInt32(m, f, index));
    case FieldDescriptor::CPPTYPE_INT64:
      return fmt::format("{}", one ? r.GetInt64(m, f) : r.GetRepeatedInt64(m, f, index));
    case FieldDescriptor::CPPTYPE_UINT32:
      return fmt::format("{}", one ? r.GetUInt32(m, f) : r.GetRepeatedUInt32(m, f, index));
    case FieldDescriptor::CPPTYPE_UINT64:
      return fmt::format("{}", one ? r.GetUInt64(m, f) : r.GetRepeatedUInt64(m, f, index));
    case FieldDescriptor::CPPTYPE_ENUM:
      return json((one ? r.GetEnum(m, f) : r.GetRepeatedEnum(m, f, index))->name());
    case FieldDescriptor::CPPTYPE_STRING: {
      const std::string text = one ? r.GetString(m, f) : r.GetRepeatedString(m, f, index);
      return json(f->type() == FieldDescriptor::TYPE_BYTES ? files::hex(text) : text);
    }
    case FieldDescriptor::CPPTYPE_MESSAGE:
      return json(one ? r.GetMessage(m, f) : r.GetRepeatedMessage(m, f, index));
  }
  return "null";
}

}  // namespace

std::string json(const std::string& text) {
  std::string out = "\"";
  for (const char c : text) {
    const auto byte = static_cast<unsigned char>(c);
    if (c == '"' || c == '\\') {
      out += '\\';
      out += c;
    } else if (byte < 0x20) {
      out += fmt::format("\\u{:04x}", byte);
    } else {
      out += c;
    }
  }
  return out + "\"";
}

std::string json(const char* text) { return json(std::string(text)); }
std::string json(double number) { return std::isfinite(number) ? fmt::format("{}", number) : "null"; }
std::string json(std::uint64_t number) { return fmt::format("{}", number); }
std::string json(bool truth) { return truth ? "true" : "false"; }

std::string json_list(const std::vector<std::string>& values) {
  std::string out;
  for (const std::string& value : values) out += (out.empty() ? "" : ", ") + value;
  return "[" + out + "]";
}

std::string json(const Message& message) {  // NOLINT(misc-no-recursion): depth is that of our .proto files
  const Reflection& reflection = *message.GetReflection();
  JsonObject object;
  for (int i = 0; i < message.GetDescriptor()->field_count(); ++i) {
    const FieldDescriptor* field = message.GetDescriptor()->field(i);
    if (field->is_repeated()) {
      std::vector<std::string> items;
      items.reserve(static_cast<std::size_t>(reflection.FieldSize(message, field)));
      for (int n = 0; n < reflection.FieldSize(message, field); ++n) {
        items.push_back(value_of(message, reflection, field, n));
      }
      object.raw(field->name().c_str(), json_list(items));
    } else if (!field->has_presence() || reflection.HasField(message, field)) {
      object.raw(field->name().c_str(), value_of(message, reflection, field, -1));
    }
  }
  return object.text();
}

}  // namespace pastern::tools
