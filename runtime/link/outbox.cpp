// What other threads want to have sent.
#include "runtime/link/outbox.h"

#include <sys/eventfd.h>
#include <unistd.h>

namespace pastern::link {

Outbox::Outbox() : fd_(::eventfd(0, EFD_CLOEXEC | EFD_NONBLOCK)) {}

Outbox::~Outbox() {
  if (fd_ >= 0) ::close(fd_);
}

void Outbox::put(Out out, std::size_t bytes) {
  {
    const std::lock_guard<std::mutex> lock(mutex_);
    if (items_.size() >= kMostItems || bytes > kMostBytes - bytes_) {
      dropped_ += 1;
      return;
    }
    bytes_ += bytes;
    items_.push_back(Item{std::move(out), bytes});
  }
  wake();
}

void Outbox::wake() {
  // Fails only when the counter is full: it is readable then, which is all that is wanted.
  const std::uint64_t one = 1;
  [[maybe_unused]] const ssize_t put = ::write(fd_, &one, sizeof one);
}

std::vector<Out> Outbox::take(std::size_t most) {
  std::uint64_t count = 0;
  [[maybe_unused]] const ssize_t got = ::read(fd_, &count, sizeof count);
  std::vector<Out> taken;
  bool left = false;
  {
    const std::lock_guard<std::mutex> lock(mutex_);
    while (!items_.empty() && taken.size() < most) {
      bytes_ -= items_.front().bytes;
      taken.push_back(std::move(items_.front().out));
      items_.pop_front();
    }
    left = !items_.empty();
  }
  if (left) wake();
  return taken;
}

std::uint64_t Outbox::dropped() const {
  const std::lock_guard<std::mutex> lock(mutex_);
  return dropped_;
}

}  // namespace pastern::link
