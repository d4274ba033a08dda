// Strict reading of text-format files: the parser's complaints become defects with the line in the file.
#include "proto/files/text.h"

#include <fcntl.h>
#include <google/protobuf/io/tokenizer.h>
#include <google/protobuf/text_format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstring>

#include "proto/files/check.h"

namespace pastern::files {
namespace {

constexpr std::size_t kMostBytes = 16UL << 20U;
constexpr std::size_t kMostComplaints = 50;

class Descriptor {
 public:
  explicit Descriptor(int fd) : fd_(fd) {}
  ~Descriptor() {
    if (fd_ >= 0) ::close(fd_);
  }
  Descriptor(const Descriptor&) = delete;
  Descriptor& operator=(const Descriptor&) = delete;
  [[nodiscard]] int get() const { return fd_; }

 private:
  int fd_;
};

constexpr const char* kText = "text of the file's message, see proto/pastern/v1";

std::string between(const std::string& text, const std::string& before, const std::string& after) {
  const std::size_t begin = text.find(before);
  if (begin == std::string::npos) return "";
  const std::size_t from = begin + before.size();
  const std::size_t end = text.find(after, from);
  return end == std::string::npos ? "" : text.substr(from, end - from);
}

std::string quoted(const std::string& token) {
  return token.size() > 1 && token.front() == '"' && token.back() == '"' ? token : "\"" + token + "\"";
}

std::string in_words(const std::string& kind) {
  if (kind == "identifier") return "a field's name";
  if (kind == "integer") return "a whole number";
  if (kind == "double") return "a number";
  return kind == "string" ? "a text in quotes" : kind;
}

// The parser's sentences in our form. They are not promised to stay as they are: what is not known is told
// as it came, as a phrase and not as a sentence.
Defect told(const std::string& place, std::string message) {
  while (!message.empty() && (message.back() == '.' || message.back() == ' ')) message.pop_back();
  for (const char* got : {", found ", ", got:"}) {
    const std::size_t at = message.find(got);
    if (message.rfind("Expected ", 0) != 0 || at == std::string::npos) continue;
    std::string found = message.substr(at + std::string(got).size());
    if (!found.empty() && found.front() == ' ') found.erase(0, 1);
    if (found.size() > 3 && found.compare(0, 2, "\"\"") == 0) found = found.substr(1, found.size() - 2);
    return {place, "", found.empty() || found == "\"\"" ? "the file's end" : quoted(found),
            in_words(message.substr(9, at - 9))};
  }
  const std::string field = between(message, "has no field named \"", "\"");
  const std::string type = between(message, "Message type \"pastern.v1.", "\"");
  if (!field.empty() && !type.empty()) {
    return {place, field, "a field of no such name", "a field of " + type + ", see proto/pastern/v1"};
  }
  const std::string value = between(message, "Unknown enumeration value of \"", "\"");
  const std::string of = between(message, "for field \"", "\"");
  if (!value.empty() && !of.empty()) {
    return {place, of, "\"" + value + "\"", "one of its names, see proto/pastern/v1"};
  }
  const std::string twice = between(message, "Non-repeated field \"", "\" is specified multiple times");
  if (!twice.empty()) return {place, twice, "the field twice", "it once"};
  if (!message.empty() && message[0] >= 'A' && message[0] <= 'Z')
    message[0] = static_cast<char>(message[0] - 'A' + 'a');
  return {place, "", "\"" + message + "\"", kText};
}

class Collector : public google::protobuf::io::ErrorCollector {
 public:
  Collector(const std::string& file, Defects& defects) : file_(file), defects_(defects) {}

  // The tokenizer counts lines and columns from 0; -1 stands for the file as a whole.
  void AddError(int line, google::protobuf::io::ColumnNumber column, const std::string& message) override {
    if (++count_ > kMostComplaints) return;
    const std::string place =
        line < 0 ? file_ : file_ + ":" + std::to_string(line + 1) + ":" + std::to_string(column + 1);
    defects_.push_back(told(place, message));
  }
  void AddWarning(int line, google::protobuf::io::ColumnNumber column, const std::string& message) override {
    AddError(line, column, message);
  }
  [[nodiscard]] bool clean() const { return count_ == 0; }

 private:
  const std::string& file_;
  Defects& defects_;
  std::size_t count_{0};
};

std::string reason(int error) { return std::strerror(error); }

}  // namespace

std::optional<std::string> read_whole(const std::string& path, Defects& defects) {
  // Not blocking: a pipe in place of a file must not hang the reader.
  const Descriptor file(::open(path.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK));
  struct stat facts {};
  if (file.get() < 0 || ::fstat(file.get(), &facts) != 0) {
    defects.push_back({path, "", reason(errno), "a file that can be read"});
    return std::nullopt;
  }
  if (!S_ISREG(facts.st_mode)) {
    defects.push_back({path, "", S_ISDIR(facts.st_mode) ? "a folder" : "no regular file", "a file"});
    return std::nullopt;
  }
  std::string bytes;
  std::string block(1UL << 16U, '\0');
  for (;;) {
    const ssize_t got = ::read(file.get(), block.data(), block.size());
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) {
      defects.push_back({path, "", reason(errno), "a file that can be read"});
      return std::nullopt;
    }
    if (got == 0) return bytes;
    bytes.append(block.data(), static_cast<std::size_t>(got));
    if (bytes.size() > kMostBytes) {
      defects.push_back({path, "", "more than 16 MiB", "at most 16 MiB"});
      return std::nullopt;
    }
  }
}

bool parse_text(std::string_view text, const std::string& file, google::protobuf::Message& message,
                Defects& defects) {
  if (text.size() > kMostBytes) {
    defects.push_back({file, "", "more than 16 MiB", "at most 16 MiB"});
    return false;
  }
  Collector collector(file, defects);
  google::protobuf::TextFormat::Parser parser;
  parser.RecordErrorsTo(&collector);
  message.Clear();
  const bool parsed = parser.ParseFromString(std::string(text), &message);
  if (!parsed || !collector.clean()) {
    if (collector.clean()) defects.push_back({file, "", "text that does not parse", "text-format protobuf"});
    return false;
  }
  const std::size_t before = defects.size();
  check_rules(message, file, "", defects);
  return defects.size() == before;
}

}  // namespace pastern::files
