// Frame of the binary files, written and judged byte by byte.
#include "proto/files/artefact.h"

#include <google/protobuf/io/coded_stream.h>
#include <google/protobuf/io/zero_copy_stream_impl_lite.h>

#include <climits>

namespace pastern::files {
namespace {

constexpr std::string_view kMagic = "PASTERN";
constexpr char kVersion = 1;
constexpr std::size_t kHeader = 20;
constexpr std::size_t kDigest = 32;

void append_little_endian(std::string& bytes, std::uint64_t value) {
  for (unsigned i = 0; i < 8; ++i) bytes += static_cast<char>(static_cast<unsigned char>(value >> (8 * i)));
}

std::uint64_t little_endian(std::string_view bytes) {
  std::uint64_t value = 0;
  for (unsigned i = 0; i < 8; ++i) {
    value |= static_cast<std::uint64_t>(static_cast<unsigned char>(bytes[i])) << (8 * i);
  }
  return value;
}

std::string serialised(const google::protobuf::Message& message) {
  std::string bytes;
  {
    google::protobuf::io::StringOutputStream stream(&bytes);
    google::protobuf::io::CodedOutputStream coded(&stream);
    coded.SetSerializationDeterministic(true);
    message.SerializePartialToCodedStream(&coded);
  }
  return bytes;
}

}  // namespace

std::string pack_artefact(std::string_view kind, const google::protobuf::Message& message) {
  const std::string payload = serialised(message);
  std::string bytes(kMagic);
  bytes += kVersion;
  bytes += kind;
  append_little_endian(bytes, payload.size());
  bytes += payload;
  bytes += raw(sha256(bytes));
  return bytes;
}

bool unpack_artefact(std::string_view bytes, std::string_view kind, const std::string& file,
                     google::protobuf::Message& message, Defects& defects) {
  const auto refuse = [&](const std::string& found, const std::string& expected) {
    defects.push_back({file, "", found, expected});
    return false;
  };
  if (bytes.size() < kHeader + kDigest) {
    return refuse(std::to_string(bytes.size()) + " bytes",
                  "a " + std::string(kind) + " file of at least " + std::to_string(kHeader + kDigest));
  }
  if (bytes.substr(0, kMagic.size()) != kMagic) return refuse("no Pastern file", "magic PASTERN");
  if (bytes[kMagic.size()] != kVersion) {
    return refuse("frame version " + std::to_string(static_cast<unsigned char>(bytes[kMagic.size()])),
                  "frame version 1");
  }
  if (bytes.substr(8, 4) != kind) {
    return refuse("kind \"" + std::string(bytes.substr(8, 4)) + "\"", "kind \"" + std::string(kind) + "\"");
  }
  const std::uint64_t length = little_endian(bytes.substr(12, 8));
  if (length > INT_MAX || length != bytes.size() - kHeader - kDigest) {
    return refuse(std::to_string(bytes.size()) + " bytes",
                  "a payload of " + std::to_string(length) + " bytes, its header and its checksum, no more");
  }
  const std::string_view covered = bytes.substr(0, bytes.size() - kDigest);
  if (raw(sha256(covered)) != bytes.substr(covered.size())) {
    return refuse("a checksum that does not fit", "an undamaged file");
  }
  if (!message.ParseFromArray(covered.data() + kHeader, static_cast<int>(length))) {
    return refuse("a payload that does not parse", "a message " + message.GetDescriptor()->full_name());
  }
  return true;
}

}  // namespace pastern::files
