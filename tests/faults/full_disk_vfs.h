// An SQLite VFS over the default one whose disk is full after so many bytes: the write that does not fit is
// cut short and fails with SQLITE_FULL, as a file system does it.
#pragma once

#include <cstdint>
#include <string>

namespace pastern::faults {

class FullDisk {
 public:
  FullDisk();
  ~FullDisk();
  FullDisk(const FullDisk&) = delete;
  FullDisk& operator=(const FullDisk&) = delete;

  [[nodiscard]] std::string vfs() const;  ///< its name, for Journal::open
  /// From now on this many bytes still fit; negative: as many as you like.
  void leave(std::int64_t bytes);
  [[nodiscard]] std::int64_t written() const;  ///< bytes since the last leave()
};

}  // namespace pastern::faults
