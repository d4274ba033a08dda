// What the link thread and the session thread share: the cycle's signals, a queue of commands and fetches,
// the latest status. Stops go straight to the signals and never wait for the session thread.
#pragma once

#include <atomic>
#include <chrono>
#include <condition_variable>
#include <cstdint>
#include <deque>
#include <mutex>
#include <string>
#include <variant>

#include "pastern/v1/link.pb.h"
#include "runtime/link/server.h"
#include "runtime/session/cycle.h"

namespace pastern::onboard {

struct Asked {
  link::Ticket ticket;
  std::variant<v1::Command, v1::Fetch> what;
  link::Asker asker;            ///< empty for a fetch
  std::uint64_t stops_seen{0};  ///< Signals::stops_asked when it came
};

class Exchange final : public link::Line {
 public:
  static constexpr std::size_t kLongestQueue = 256;

  explicit Exchange(session::Signals& signals) : signals_(signals) {}

  // Link thread.
  void stop() override;
  void halt() override;
  [[nodiscard]] bool stop_confirmed() const override;
  void baton_held(bool held) override;
  [[nodiscard]] bool submit(link::Ticket ticket, const v1::Command& command,
                            const link::Asker& asker) override;
  [[nodiscard]] bool submit(link::Ticket ticket, const v1::Fetch& fetch) override;
  [[nodiscard]] v1::Status status() const override;

  // Session thread.
  [[nodiscard]] bool take(Asked& asked);
  /// Until something is asked, a stop comes, or the time is over.
  void wait(std::chrono::milliseconds time);
  void show(const v1::Status& status);

 private:
  void set(std::atomic<bool>& flag);
  [[nodiscard]] bool push(Asked asked);

  session::Signals& signals_;
  std::atomic<std::uint64_t> commands_at_stop_{0};
  mutable std::mutex mutex_;
  std::condition_variable woken_;
  bool stop_came_{false};
  std::deque<Asked> queue_;
  v1::Status status_;
};

}  // namespace pastern::onboard
