// Locks are held for a copy at the most; the cycle takes none of them.
#include "runtime/onboard/exchange.h"

#include <utility>

namespace pastern::onboard {

void Exchange::stop() { set(signals_.stop); }

void Exchange::halt() { set(signals_.halt); }

// A command counts as confirmation only when it was written after the flag was set; the flag does not wait
// for the lock.
void Exchange::set(std::atomic<bool>& flag) {
  signals_.stops_asked.fetch_add(1);
  commands_at_stop_.store(signals_.stopped_commands.load(std::memory_order_acquire),
                          std::memory_order_release);
  flag.store(true);
  {
    const std::lock_guard lock(mutex_);
    stop_came_ = true;
  }
  woken_.notify_one();
}

bool Exchange::stop_confirmed() const {
  return signals_.stopped_commands.load(std::memory_order_acquire) !=
         commands_at_stop_.load(std::memory_order_acquire);
}

void Exchange::baton_held(bool held) { signals_.baton_lost.store(!held, std::memory_order_release); }

bool Exchange::submit(link::Ticket ticket, const v1::Command& command, const link::Asker& asker) {
  return push({ticket, command, asker, 0});
}

bool Exchange::submit(link::Ticket ticket, const v1::Fetch& fetch) { return push({ticket, fetch, {}, 0}); }

bool Exchange::push(Asked asked) {
  asked.stops_seen = signals_.stops_asked.load();
  {
    const std::lock_guard lock(mutex_);
    if (queue_.size() >= kLongestQueue) return false;
    queue_.push_back(std::move(asked));
  }
  woken_.notify_one();
  return true;
}

v1::Status Exchange::status() const {
  const std::lock_guard lock(mutex_);
  return status_;
}

bool Exchange::take(Asked& asked) {
  const std::lock_guard lock(mutex_);
  if (queue_.empty()) return false;
  asked = std::move(queue_.front());
  queue_.pop_front();
  return true;
}

void Exchange::wait(std::chrono::milliseconds time) {
  std::unique_lock lock(mutex_);
  woken_.wait_for(lock, time, [this] { return !queue_.empty() || stop_came_; });
  stop_came_ = false;
}

void Exchange::show(const v1::Status& status) {
  const std::lock_guard lock(mutex_);
  status_ = status;
}

}  // namespace pastern::onboard
