// flock(2) on a file of its own: SQLite's byte-range locks on the database stay untouched.
#include "runtime/journal/folder_lock.h"

#include <fcntl.h>
#include <sys/file.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <system_error>

namespace pastern::journal {
namespace {

std::string words_of(int error) { return std::generic_category().message(error); }

std::string holder(int file) {
  std::array<char, 32> text{};
  const ssize_t size = ::pread(file, text.data(), text.size() - 1, 0);
  std::string digits;
  for (ssize_t i = 0;
       i < size && text[static_cast<std::size_t>(i)] >= '0' && text[static_cast<std::size_t>(i)] <= '9'; ++i)
    digits += text[static_cast<std::size_t>(i)];
  return digits.empty() ? "another program" : "process " + digits;
}

}  // namespace

FolderLock::~FolderLock() {
  if (file_ >= 0) ::close(file_);
}

bool FolderLock::take(const std::string& folder, std::string& words) {
  const std::string path = folder + "/pastern.lock";
  file_ = ::open(path.c_str(), O_RDWR | O_CREAT | O_CLOEXEC, 0644);
  if (file_ < 0) {
    words = path + ": cannot be made: " + words_of(errno);
    return false;
  }
  if (::flock(file_, LOCK_EX | LOCK_NB) != 0) {
    words = errno == EWOULDBLOCK ? folder + ": locked, " + holder(file_) + " writes this journal"
                                 : path + ": cannot be locked: " + words_of(errno);
    return false;
  }
  // The number is for people (the words above). A full disk must not keep the journal from being opened.
  const std::string number = std::to_string(::getpid()) + "\n";
  if (::ftruncate(file_, 0) == 0 && ::pwrite(file_, number.data(), number.size(), 0) < 0) return true;
  return true;
}

bool sync_folder(const std::string& folder, std::string& words) {
  const int file = ::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  const bool synced = file >= 0 && ::fsync(file) == 0;
  if (!synced) words = folder + ": cannot be synced: " + words_of(errno);
  if (file >= 0) ::close(file);
  return synced;
}

}  // namespace pastern::journal
