// One program writes a journal folder: an advisory lock that the kernel drops when its holder dies.
#pragma once

#include <string>

namespace pastern::journal {

class FolderLock {
 public:
  FolderLock() = default;
  ~FolderLock();
  FolderLock(const FolderLock&) = delete;
  FolderLock& operator=(const FolderLock&) = delete;

  /// Takes `folder`/pastern.lock without waiting. False with words: held by which process, or why it cannot
  /// be made.
  [[nodiscard]] bool take(const std::string& folder, std::string& words);

 private:
  int file_{-1};
};

/// Makes the names in `folder` durable (fsync on the folder). False with words.
[[nodiscard]] bool sync_folder(const std::string& folder, std::string& words);

}  // namespace pastern::journal
