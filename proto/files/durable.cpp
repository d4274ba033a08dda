// The one way in which whole files come to be written.
#include "proto/files/durable.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdlib>
#include <cstring>

namespace pastern::files {
namespace {

struct Failure {
  const char* step;
  int error;
};

std::string folder_of(const std::string& path) {
  const std::size_t slash = path.rfind('/');
  if (slash == std::string::npos) return ".";
  return slash == 0 ? "/" : path.substr(0, slash);
}

bool write_all(int fd, std::string_view bytes) {
  while (!bytes.empty()) {
    const ssize_t put = ::write(fd, bytes.data(), bytes.size());
    if (put < 0 && errno == EINTR) continue;
    if (put < 0) return false;
    bytes.remove_prefix(static_cast<std::size_t>(put));
  }
  return true;
}

// Fills and syncs the temporary file; closes it in any case. Null step: done.
Failure fill(int fd, std::string_view bytes, unsigned mode) {
  Failure failure{nullptr, 0};
  const auto note = [&failure](const char* step) {
    if (failure.step == nullptr) failure = {step, errno};
  };
  if (!write_all(fd, bytes)) note("writing");
  if (failure.step == nullptr && ::fchmod(fd, static_cast<mode_t>(mode)) != 0) note("setting the mode");
  if (failure.step == nullptr && ::fsync(fd) != 0) note("syncing");
  if (::close(fd) != 0) note("closing");
  return failure;
}

}  // namespace

bool write_durably(const std::string& path, std::string_view bytes, unsigned mode, Defects& defects) {
  const auto refuse = [&](const Failure& failure) {
    defects.push_back({path, "", std::string(std::strerror(failure.error)) + " while " + failure.step,
                       "a file that can be written"});
    return false;
  };
  struct stat facts {};
  if (::stat(path.c_str(), &facts) == 0 && !S_ISREG(facts.st_mode)) {
    defects.push_back({path, "", S_ISDIR(facts.st_mode) ? "a folder" : "no regular file", "a file"});
    return false;
  }
  std::string temporary = path + ".new.XXXXXX";
  const int fd = ::mkostemp(temporary.data(), O_CLOEXEC);
  if (fd < 0) return refuse({"making a temporary file beside it", errno});
  Failure failure = fill(fd, bytes, mode);
  // Opened before the rename: a folder that cannot be opened must not be found out afterwards.
  const int folder = ::open(folder_of(path).c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (failure.step == nullptr && folder < 0) failure = {"opening its folder", errno};
  if (failure.step == nullptr && ::rename(temporary.c_str(), path.c_str()) != 0)
    failure = {"renaming", errno};
  if (failure.step != nullptr) {
    ::unlink(temporary.c_str());
  } else if (::fsync(folder) != 0) {
    failure = {"syncing its folder", errno};
  }
  if (folder >= 0) ::close(folder);
  return failure.step == nullptr || refuse(failure);
}

}  // namespace pastern::files
