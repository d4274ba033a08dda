// CURVE keys in files.
#include "runtime/link/keys.h"

#include <dirent.h>
#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>
#include <zmq.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <cstring>

#include "proto/files/durable.h"

namespace pastern::link {
namespace {

constexpr std::size_t kKeyChars = 40;  // RFC 32: 32 bytes are 40 characters
constexpr std::size_t kKeyBytes = 32;
constexpr std::size_t kLongestName = 32;
constexpr char kObserver[] = ".observer.public";
constexpr char kOperator[] = ".operator.public";
constexpr char kSecret[] = ".secret";
constexpr char kPublic[] = ".public";

bool fail(std::string& error, const std::string& file, const std::string& found,
          const std::string& expected) {
  error = file + ": found " + found + ", expected " + expected;
  return false;
}

bool good_name(const std::string& name, std::string& error) {
  const bool good =
      !name.empty() && name.size() <= kLongestName && std::all_of(name.begin(), name.end(), [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '-' ||
               c == '_';
      });
  if (good) return true;
  std::string shown = name.substr(0, 64);
  std::replace_if(
      shown.begin(), shown.end(), [](char c) { return c < ' ' || c == 0x7f; }, '?');
  return fail(error, "key name", "'" + shown + "'", "1 to 32 letters, digits, - or _");
}

// zmq_z85_decode of libzmq 4.3.4 lets some characters outside the alphabet through; this one does not.
bool good_key(const std::string& text) {
  static const std::string alphabet =
      "0123456789abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ.-:+=^!/*?&<>()[]{}@%$#";
  if (text.size() != kKeyChars || text.find_first_not_of(alphabet) != std::string::npos) return false;
  std::array<std::uint8_t, kKeyBytes> bytes{};
  return zmq_z85_decode(bytes.data(), text.c_str()) != nullptr;
}

class Fd {
 public:
  explicit Fd(int fd) : fd_(fd) {}
  ~Fd() {
    if (fd_ >= 0) ::close(fd_);
  }
  Fd(const Fd&) = delete;
  Fd& operator=(const Fd&) = delete;
  [[nodiscard]] int get() const { return fd_; }

 private:
  int fd_;
};

// The file as opened is the file that is judged: no time passes between.
bool read_key(const std::string& path, bool secret, std::string& key, std::string& error) {
  const Fd fd(::open(path.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK));
  if (fd.get() < 0) return fail(error, path, std::strerror(errno), "a key file that can be read");
  struct stat facts {};
  if (::fstat(fd.get(), &facts) != 0 || !S_ISREG(facts.st_mode)) {
    return fail(error, path, "no regular file", "a key file");
  }
  if (secret && (facts.st_mode & 077) != 0) {
    std::array<char, 8> mode{};
    (void)std::snprintf(mode.data(), mode.size(), "%04o", static_cast<unsigned>(facts.st_mode & 07777));
    return fail(error, path, std::string("mode ") + mode.data(), "0600: a secret key is for its owner alone");
  }
  std::array<char, 128> text{};
  const ssize_t got = ::read(fd.get(), text.data(), text.size());
  if (got < 0) return fail(error, path, std::strerror(errno), "a key file that can be read");
  std::string found(text.data(), static_cast<std::size_t>(got));
  while (!found.empty() && (found.back() == '\n' || found.back() == '\r')) found.pop_back();
  if (!good_key(found)) {
    return fail(error, path, std::to_string(found.size()) + " characters that are no key",
                "a key of 40 characters (Z85)");
  }
  key = found;
  return true;
}

bool read_pair(const std::string& stem, std::string& public_z85, std::string& secret_z85,
               std::string& error) {
  if (!read_key(stem + kSecret, true, secret_z85, error)) return false;
  if (!read_key(stem + kPublic, false, public_z85, error)) return false;
  std::array<char, kKeyChars + 1> derived{};
  if (zmq_curve_public(derived.data(), secret_z85.c_str()) != 0 || public_z85 != derived.data()) {
    return fail(error, stem + kPublic, "a key of another pair", "the public key of " + stem + kSecret);
  }
  return true;
}

bool write_key(const std::string& path, const std::string& key, unsigned mode, std::string& error) {
  files::Defects defects;
  if (files::write_durably(path, key + "\n", mode, defects)) return true;
  error = defects.empty() ? path + ": cannot be written" : defects.front().line();
  return false;
}

bool make_folder(const std::string& folder, mode_t mode, std::string& error) {
  if (::mkdir(folder.c_str(), mode) == 0 || errno == EEXIST) return true;
  return fail(error, folder, std::strerror(errno), "a folder that can be made");
}

bool exists(const std::string& path) {
  struct stat facts {};
  return ::lstat(path.c_str(), &facts) == 0;
}

// Whoever can write here can put himself on the list.
bool guarded(const std::string& folder, std::string& error) {
  struct stat facts {};
  if (::stat(folder.c_str(), &facts) != 0 || !S_ISDIR(facts.st_mode)) {
    return fail(error, folder, "no folder", "a key folder");
  }
  if ((facts.st_mode & 022) == 0) return true;
  return fail(error, folder, "a folder that others can write to", "one that only its owner can (chmod go-w)");
}

bool ends_with(const std::string& text, const std::string& end) {
  return text.size() > end.size() && text.compare(text.size() - end.size(), end.size(), end) == 0;
}

/// File names in a folder, sorted; empty when it cannot be read.
std::vector<std::string> names_in(const std::string& folder) {
  std::vector<std::string> names;
  DIR* open_folder = ::opendir(folder.c_str());
  if (open_folder == nullptr) return names;
  while (const dirent* entry = ::readdir(open_folder)) names.emplace_back(entry->d_name);
  ::closedir(open_folder);
  std::sort(names.begin(), names.end());
  return names;
}

std::string allowed_folder(const std::string& folder) { return folder + "/allowed"; }

}  // namespace

bool make_pair(const std::string& folder, const std::string& name, std::string& error) {
  if (!good_name(name, error) || !make_folder(folder, 0700, error)) return false;
  const std::string stem = folder + "/" + name;
  for (const char* kind : {kSecret, kPublic}) {
    if (exists(stem + kind))
      return fail(error, stem + kind, "a key that is there already", "none (never overwritten)");
  }
  std::array<char, kKeyChars + 1> public_z85{};
  std::array<char, kKeyChars + 1> secret_z85{};
  if (zmq_curve_keypair(public_z85.data(), secret_z85.data()) != 0) {
    return fail(error, stem, zmq_strerror(zmq_errno()), "a ZeroMQ library with CURVE");
  }
  if (!write_key(stem + kSecret, secret_z85.data(), 0600, error)) return false;
  if (write_key(stem + kPublic, public_z85.data(), 0644, error)) return true;
  ::unlink((stem + kSecret).c_str());
  return false;
}

std::vector<std::string> read_allowed(const std::string& folder, std::vector<AllowedKey>& allowed) {
  std::vector<std::string> defects;
  const std::string list = allowed_folder(folder);
  for (const std::string& file : names_in(list)) {
    const bool commander = ends_with(file, kOperator);
    if (!commander && !ends_with(file, kObserver)) continue;
    AllowedKey key;
    key.commander = commander;
    key.name = file.substr(0, file.size() - (commander ? sizeof kOperator : sizeof kObserver) + 1);
    std::string path = list;
    path.append("/").append(file);
    std::string error;
    if (!good_name(key.name, error) || !read_key(path, false, key.public_z85, error)) {
      defects.push_back(error);
      continue;
    }
    for (const AllowedKey& other : allowed) {
      if (other.name != key.name && other.public_z85 != key.public_z85) continue;
      defects.push_back(path.append(": found a key or name that ")
                            .append(other.name)
                            .append(" has already, expected each once"));
      break;
    }
    allowed.push_back(key);
  }
  return defects;
}

bool read_robot_keys(const std::string& folder, RobotKeys& keys, std::string& error) {
  RobotKeys read;
  if (!guarded(folder, error)) return false;
  if (!read_pair(folder + "/robot", read.public_z85, read.secret_z85, error)) return false;
  if (exists(allowed_folder(folder)) && !guarded(allowed_folder(folder), error)) return false;
  const std::vector<std::string> defects = read_allowed(folder, read.allowed);
  if (!defects.empty()) {
    error = defects.front();
    return false;
  }
  keys = read;
  return true;
}

bool read_ground_keys(const std::string& folder, GroundKeys& keys, std::string& error) {
  GroundKeys read;
  for (const std::string& file : names_in(folder)) {
    if (!ends_with(file, kSecret)) continue;
    if (!read.name.empty()) {
      return fail(error, folder, "the secret keys " + read.name + " and " + file.substr(0, file.size() - 7),
                  "one pair of keys in a ground tool's folder");
    }
    read.name = file.substr(0, file.size() - sizeof kSecret + 1);
  }
  if (read.name.empty())
    return fail(error, folder, "no secret key", "NAME.secret, NAME.public, robot.public");
  if (read.name == "robot")
    return fail(error, folder, "the robot's secret key", "a ground tool's key folder");
  if (!read_pair(folder + "/" + read.name, read.public_z85, read.secret_z85, error)) return false;
  if (!read_key(folder + "/robot.public", false, read.robot_public_z85, error)) return false;
  keys = read;
  return true;
}

bool allow(const std::string& folder, const std::string& name, bool commander, const std::string& public_z85,
           std::string& error) {
  if (!good_name(name, error)) return false;
  if (!good_key(public_z85)) {
    return fail(error, "public key of " + name,
                std::to_string(public_z85.size()) + " characters that are no key",
                "a key of 40 characters (Z85)");
  }
  const std::string list = allowed_folder(folder);
  if (!make_folder(list, 0755, error) || !guarded(list, error)) return false;
  std::vector<AllowedKey> listed;
  // A defect elsewhere in the list does not stand in the way of adding to it; start-up names it.
  (void)read_allowed(folder, listed);
  for (const AllowedKey& other : listed) {
    if (other.name != name && other.public_z85 != public_z85) continue;
    return fail(error, list, "'" + other.name + "' on the list with this name or this key",
                "it to be revoked first");
  }
  return write_key(list + "/" + name + (commander ? kOperator : kObserver), public_z85, 0644, error);
}

bool revoke(const std::string& folder, const std::string& name, std::string& error) {
  if (!good_name(name, error)) return false;
  const std::string list = allowed_folder(folder);
  bool found = false;
  for (const char* kind : {kObserver, kOperator}) {
    std::string path = list;
    path.append("/").append(name).append(kind);
    if (::unlink(path.c_str()) == 0) {
      found = true;
    } else if (errno != ENOENT) {
      return fail(error, path, std::strerror(errno), "a file that can be removed");
    }
  }
  if (!found) return fail(error, list, "no key of the name '" + name + "'", "a name on the list");
  // Taken away for good, also after a power cut.
  const Fd fd(::open(list.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC));
  if (fd.get() < 0 || ::fsync(fd.get()) != 0) {
    return fail(error, list, std::strerror(errno), "a folder that can be synced");
  }
  return true;
}

}  // namespace pastern::link
