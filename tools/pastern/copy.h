// A consistent copy of the robot's journal on the ground: from a folder, or fetched over the link. Read-only.
#pragma once

#include <memory>
#include <optional>
#include <string>

#include "runtime/journal/journal.h"
#include "tools/pastern/reach.h"

namespace pastern::tools {

/// Journal opened read-only; the fetched copy lies in a temporary folder that goes with this object.
class JournalCopy {
 public:
  JournalCopy() = default;
  JournalCopy(JournalCopy&& other) noexcept;
  JournalCopy& operator=(JournalCopy&&) = delete;
  JournalCopy(const JournalCopy&) = delete;
  JournalCopy& operator=(const JournalCopy&) = delete;
  ~JournalCopy();

  [[nodiscard]] const journal::Journal& journal() const { return *journal_; }
  /// Where it came from, for people.
  [[nodiscard]] const std::string& source() const { return source_; }

  /// `folder`: a journal folder or file. Complains and returns nothing otherwise.
  [[nodiscard]] static std::optional<JournalCopy> from_folder(const std::string& folder,
                                                              const std::string& verb);
  [[nodiscard]] static std::optional<JournalCopy> from_robot(RobotLine& line, const std::string& verb,
                                                             Exit& exit);

 private:
  std::unique_ptr<journal::Journal> journal_;
  std::string source_;
  std::string temporary_;
};

/// The policy file's bytes with that SHA-256, from the robot; nothing after a complaint.
[[nodiscard]] std::optional<std::string> fetch_policy(RobotLine& line, const std::string& sha256_hex,
                                                      const std::string& verb);

}  // namespace pastern::tools
