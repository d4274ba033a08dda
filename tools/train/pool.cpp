// An atomic counter is the queue: a walk takes milliseconds, a thread's start tens of microseconds.
#include "tools/train/pool.h"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

namespace pastern::tools {

unsigned all_threads() { return std::max(1U, std::thread::hardware_concurrency()); }

void spread(unsigned threads, std::size_t count,
            const std::function<void(unsigned worker, std::size_t i)>& job) {
  std::atomic<std::size_t> next{0};
  std::exception_ptr failure;
  std::mutex failed;
  const auto work = [&](unsigned worker) {
    try {
      for (std::size_t i = next.fetch_add(1); i < count; i = next.fetch_add(1)) job(worker, i);
    } catch (...) {
      next.store(count);
      const std::lock_guard<std::mutex> lock(failed);
      if (!failure) failure = std::current_exception();
    }
  };
  std::vector<std::jthread> others;
  const auto most =
      static_cast<unsigned>(std::min<std::size_t>(std::max(1U, threads), std::max<std::size_t>(1, count)));
  for (unsigned worker = 1; worker < most; ++worker) others.emplace_back(work, worker);
  work(0);
  others.clear();
  if (failure) std::rethrow_exception(failure);
}

}  // namespace pastern::tools
