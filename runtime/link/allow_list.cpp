// The robot's list of keys, kept up to date.
#include "runtime/link/allow_list.h"

#include <algorithm>
#include <chrono>

#include "runtime/link/wire.h"

namespace pastern::link {
namespace {

constexpr std::chrono::milliseconds kEvery{1000};

bool same(const Allowed& a, const Allowed& b) {
  return std::equal(a.begin(), a.end(), b.begin(), b.end(), [](const auto& x, const auto& y) {
    return x.first == y.first && x.second.name == y.second.name && x.second.commander == y.second.commander;
  });
}

bool withdraws(const Allowed& before, const Allowed& after) {
  return std::any_of(before.begin(), before.end(), [&after](const auto& entry) {
    const auto still = after.find(entry.first);
    return still == after.end() || (entry.second.commander && !still->second.commander);
  });
}

}  // namespace

Allowed by_key(const std::vector<AllowedKey>& keys) {
  Allowed allowed;
  for (const AllowedKey& key : keys) {
    const auto [at, fresh] = allowed.emplace(key.public_z85, key);
    if (!fresh && !key.commander) at->second = key;
  }
  return allowed;
}

AllowList::AllowList(std::string key_folder, Allowed first, std::function<void()> changed)
    : key_folder_(std::move(key_folder)),
      changed_(std::move(changed)),
      allowed_(std::make_shared<const Allowed>(std::move(first))),
      thread_([this] { run(); }) {}

AllowList::~AllowList() {
  {
    const std::lock_guard<std::mutex> lock(mutex_);
    ending_ = true;
  }
  wake_.notify_all();
  thread_.join();
}

std::shared_ptr<const Allowed> AllowList::now() const {
  const std::lock_guard<std::mutex> lock(mutex_);
  return allowed_;
}

void AllowList::run() {
  wire::block_signals();
  std::unique_lock<std::mutex> lock(mutex_);
  while (!ending_) {
    wake_.wait_for(lock, kEvery, [this] { return ending_; });
    if (ending_) return;
    lock.unlock();
    read_again();
    lock.lock();
  }
}

// The whole folder each time, not only when its modification time differs: a file rewritten in place changes
// no folder's time, and two changes within the clock's grain look like one. It is a few small files.
void AllowList::read_again() {
  std::vector<AllowedKey> keys;
  read_allowed(key_folder_, keys);
  auto fresh = std::make_shared<const Allowed>(by_key(keys));
  const std::shared_ptr<const Allowed> before = now();
  if (same(*before, *fresh)) return;
  {
    const std::lock_guard<std::mutex> lock(mutex_);
    allowed_ = fresh;
  }
  if (withdraws(*before, *fresh)) withdrawals_.fetch_add(1);
  changed_();
}

}  // namespace pastern::link
