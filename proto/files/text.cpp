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

class Collector : public google::protobuf::io::ErrorCollector {
 public:
  Collector(const std::string& file, Defects& defects) : file_(file), defects_(defects) {}

  // The tokenizer counts lines and columns from 0; -1 stands for the file as a whole.
  void AddError(int line, google::protobuf::io::ColumnNumber column, const std::string& message) override {
    if (++count_ > kMostComplaints) return;
    const std::string place =
        line < 0 ? file_ : file_ + ":" + std::to_string(line + 1) + ":" + std::to_string(column + 1);
    defects_.push_back({place, "", message, "text of the file's message, see proto/pastern/v1"});
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
