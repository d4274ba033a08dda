// The robot's list of keys, kept up to date: a thread of its own reads the folder once a second, so that the
// link thread never waits for a disk. A folder or a file that cannot be read allows nobody.
#pragma once

#include <atomic>
#include <condition_variable>
#include <cstdint>
#include <functional>
#include <map>
#include <memory>
#include <mutex>
#include <string>
#include <thread>

#include "runtime/link/keys.h"

namespace pastern::link {

/// By public key, Z85.
using Allowed = std::map<std::string, AllowedKey>;

/// A key listed twice has the lesser of its roles.
[[nodiscard]] Allowed by_key(const std::vector<AllowedKey>& keys);

class AllowList {
 public:
  /// `changed` is called from the list's thread after each change; it must not block.
  AllowList(std::string key_folder, Allowed first, std::function<void()> changed);
  ~AllowList();
  AllowList(const AllowList&) = delete;
  AllowList& operator=(const AllowList&) = delete;

  /// The list as last read. Any thread; a short lock.
  [[nodiscard]] std::shared_ptr<const Allowed> now() const;
  /// Rises whenever a key left the list or lost a role. Any thread.
  [[nodiscard]] std::uint64_t withdrawals() const { return withdrawals_.load(); }

 private:
  void run();
  void read_again();

  const std::string key_folder_;
  const std::function<void()> changed_;
  mutable std::mutex mutex_;
  std::condition_variable wake_;
  bool ending_{false};
  std::shared_ptr<const Allowed> allowed_;
  std::atomic<std::uint64_t> withdrawals_{0};
  std::thread thread_;
};

}  // namespace pastern::link
