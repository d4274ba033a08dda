// Signs of life for a baton, from a thread with a socket of its own (a ZeroMQ socket belongs to one thread).
#pragma once

#include <atomic>
#include <condition_variable>
#include <cstdint>
#include <mutex>
#include <string>
#include <thread>

#include "runtime/link/caller.h"

namespace pastern::link {

class Renewal {
 public:
  Renewal(Dial& dial, int port, std::string operator_name, std::uint64_t number);
  ~Renewal();  ///< ends the thread; the baton lapses unless it is given back
  Renewal(const Renewal&) = delete;
  Renewal& operator=(const Renewal&) = delete;

  /// 0 once the robot has said that the number is stale. Any thread.
  [[nodiscard]] std::uint64_t number() const { return number_.load(); }

 private:
  void run();
  [[nodiscard]] std::string sign() const;

  Dial& dial_;
  const int port_;
  const std::string operator_name_;
  std::atomic<std::uint64_t> number_;
  std::mutex mutex_;
  std::condition_variable wake_;
  bool ending_{false};
  std::thread thread_;
};

/// 128 random bits in hexadecimal: never the same twice.
[[nodiscard]] std::string fresh_id();

}  // namespace pastern::link
