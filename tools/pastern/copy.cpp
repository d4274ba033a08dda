// See copy.h.
#include "tools/pastern/copy.h"

#include <fmt/format.h>

#include <cstdlib>
#include <filesystem>
#include <utility>

#include "proto/files/durable.h"
#include "proto/files/sha256.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

/// Bytes of a hex hash; empty when it is not one.
std::string from_hex(const std::string& hex) {
  if (hex.size() != 64 || hex.find_first_not_of("0123456789abcdef") != std::string::npos) return "";
  std::string bytes;
  for (std::size_t i = 0; i < hex.size(); i += 2) {
    bytes.push_back(static_cast<char>(std::stoi(hex.substr(i, 2), nullptr, 16)));
  }
  return bytes;
}

/// A walk may be recorded while the pieces are fetched: then the size changes and it begins anew.
std::optional<std::string> fetch_journal(RobotLine& line, std::string& why) {
  std::string bytes;
  std::uint64_t total = 0;
  for (int restarts = 0; restarts < 5;) {
    v1::Fetch fetch;
    fetch.mutable_journal()->set_offset(bytes.size());
    const auto piece = line.client().fetch(fetch);
    if (!piece || !piece->ok()) {
      why = piece ? piece->words() : fmt::format("no answer from {}", line.reach().endpoint());
      return std::nullopt;
    }
    if (!bytes.empty() && piece->total_bytes() != total) {
      bytes.clear();
      ++restarts;
      continue;
    }
    total = piece->total_bytes();
    bytes += piece->bytes();
    if (bytes.size() >= total) return bytes;
    if (piece->bytes().empty()) break;
  }
  why = fmt::format("found {} bytes of the journal, expected {}", bytes.size(), total);
  return std::nullopt;
}

}  // namespace

JournalCopy::JournalCopy(JournalCopy&& other) noexcept
    : journal_(std::move(other.journal_)),
      source_(std::move(other.source_)),
      temporary_(std::exchange(other.temporary_, std::string())) {}

JournalCopy::~JournalCopy() {
  journal_.reset();
  std::error_code error;
  if (!temporary_.empty()) std::filesystem::remove_all(temporary_, error);
}

std::optional<JournalCopy> JournalCopy::from_folder(const std::string& folder, const std::string& verb) {
  JournalCopy copy;
  copy.source_ = folder;
  std::string error;
  copy.journal_ = journal::Journal::open(folder, error, "", true);
  if (copy.journal_) return copy;
  complain(fmt::format("pastern {}: {}", verb, error));
  return std::nullopt;
}

std::optional<JournalCopy> JournalCopy::from_robot(RobotLine& line, const std::string& verb, Exit& exit) {
  v1::Status status;
  exit = line.status(status);
  if (exit != Exit::done) return std::nullopt;
  std::string why;
  const auto bytes = fetch_journal(line, why);
  exit = Exit::refused;
  if (!bytes) {
    complain(fmt::format("pastern {}: the journal was not fetched: {}", verb, why));
    return std::nullopt;
  }
  exit = Exit::internal;
  JournalCopy copy;
  std::string pattern = std::filesystem::temp_directory_path().string() + "/pastern-journal-XXXXXX";
  if (mkdtemp(pattern.data()) == nullptr) {
    complain(fmt::format("pastern {}: no temporary folder like {} could be made", verb, pattern));
    return std::nullopt;
  }
  copy.temporary_ = pattern;
  files::Defects defects;
  std::string error;
  if (files::write_durably(pattern + "/pastern.journal", *bytes, 0600, defects)) {
    copy.journal_ = journal::Journal::open(pattern, error, "", true);
  }
  for (const files::Defect& defect : defects) error = defect.line();
  if (!copy.journal_) {
    complain(fmt::format("pastern {}: the fetched journal: {}", verb, error));
    return std::nullopt;
  }
  copy.source_ = line.reach().endpoint();
  exit = Exit::done;
  return copy;
}

std::optional<std::string> fetch_policy(RobotLine& line, const std::string& sha256_hex,
                                        const std::string& verb) {
  v1::Fetch fetch;
  fetch.mutable_policy()->set_sha256(from_hex(sha256_hex));
  const auto fetched = line.client().fetch(fetch);
  if (!fetched || !fetched->ok()) {
    complain(fmt::format("pastern {}: policy {} was not fetched: {}", verb, brief_hash(sha256_hex),
                         fetched ? fetched->words() : "no answer from " + line.reach().endpoint()));
    return std::nullopt;
  }
  if (files::hex(files::sha256(fetched->bytes())) != sha256_hex) {
    complain(
        fmt::format("pastern {}: policy {}: the bytes that came have another sha256; nothing was written",
                    verb, brief_hash(sha256_hex)));
    return std::nullopt;
  }
  return fetched->bytes();
}

}  // namespace pastern::tools
