// JSON (RFC 8259) for --json: small values built by hand, and any of our messages by its own fields.
#pragma once

#include <google/protobuf/message.h>

#include <cstdint>
#include <string>
#include <vector>

namespace pastern::tools {

/// A quoted string.
[[nodiscard]] std::string json(const std::string& text);
[[nodiscard]] std::string json(const char* text);
/// Shortest digits that read back to the same number; null when it is not finite (JSON has no word for it).
[[nodiscard]] std::string json(double number);
[[nodiscard]] std::string json(std::uint64_t number);
[[nodiscard]] std::string json(bool truth);

/// {"a": 1, "b": ...} in the order of the calls.
class JsonObject {
 public:
  template <class T>
  JsonObject& add(const char* key, const T& value) {
    return raw(key, json(value));
  }
  JsonObject& raw(const char* key, const std::string& value) {
    text_ += (text_.empty() ? "" : ", ") + json(key) + ": " + value;
    return *this;
  }
  [[nodiscard]] std::string text() const { return "{" + text_ + "}"; }

 private:
  std::string text_;
};

[[nodiscard]] std::string json_list(const std::vector<std::string>& values);

/// Fields under their .proto names: enums by name, bytes as hex digits, 64-bit numbers as numbers. Fields
/// without presence are always there, sub-messages only when set.
[[nodiscard]] std::string json(const google::protobuf::Message& message);

}  // namespace pastern::tools
