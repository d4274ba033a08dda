// What other threads want to have sent: a bounded queue and an eventfd that wakes the link thread. The link
// thread is not the cycle: a short lock is fine here.
#pragma once

#include <cstdint>
#include <deque>
#include <mutex>
#include <string>
#include <variant>
#include <vector>

#include "pastern/v1/link.pb.h"
#include "runtime/link/server.h"

namespace pastern::link {

struct OutAnswer {
  Ticket ticket;
  v1::Answer answer;
};
struct OutFetched {
  Ticket ticket;
  std::string bytes;
};
struct OutTelemetry {
  std::string bytes;
};
using Out = std::variant<OutAnswer, OutFetched, OutTelemetry>;

class Outbox {
 public:
  static constexpr std::size_t kMostItems = 2048;
  static constexpr std::size_t kMostBytes = 64 << 20;

  Outbox();
  ~Outbox();
  Outbox(const Outbox&) = delete;
  Outbox& operator=(const Outbox&) = delete;

  /// Becomes readable when there is something; -1 when the system gave none.
  [[nodiscard]] int fd() const { return fd_; }
  /// Any thread. Dropped and counted when full.
  void put(Out out, std::size_t bytes);
  /// Any thread: wakes the link thread without an item.
  void wake();
  /// Link thread: at most `most` items, oldest first. The fd stays readable while more are left.
  [[nodiscard]] std::vector<Out> take(std::size_t most);
  [[nodiscard]] std::uint64_t dropped() const;

 private:
  struct Item {
    Out out;
    std::size_t bytes;
  };
  int fd_;
  mutable std::mutex mutex_;
  std::deque<Item> items_;
  std::size_t bytes_{0};
  std::uint64_t dropped_{0};
};

}  // namespace pastern::link
