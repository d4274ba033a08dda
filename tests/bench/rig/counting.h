// Counts what a thread must not do inside the cycle: allocations and locks. Linked into a bench, counting.cpp
// takes the place of malloc and of pthread's locks for the whole process and passes every call on.
#pragma once

#include <cstdint>

namespace pastern::bench {

struct Counts {
  std::uint64_t allocations{0};  ///< malloc, calloc, realloc, memalign and their kin, free not counted
  std::uint64_t locks{0};        ///< mutex, read-write lock, spin lock, condition, semaphore, barrier
};

/// From now on the calling thread's calls are counted.
void count_from_here() noexcept;
/// And no longer. What was counted since count_from_here().
[[nodiscard]] Counts count_until_here() noexcept;

}  // namespace pastern::bench
