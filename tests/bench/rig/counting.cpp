// Stands in for malloc (over glibc's own) and for pthread's locks (over the next definition).
#include "tests/bench/rig/counting.h"

#include <dlfcn.h>
#include <pthread.h>
#include <semaphore.h>

#include <cerrno>
#include <cstddef>

namespace pastern::bench {
namespace {

thread_local bool counting = false;
thread_local Counts counts;

[[maybe_unused]] void allocated() noexcept {
  if (counting) ++counts.allocations;
}
[[maybe_unused]] void locked() noexcept {
  if (counting) ++counts.locks;
}

template <class F>
[[maybe_unused]] F next(F /*like*/, const char* name) noexcept {
  return reinterpret_cast<F>(dlsym(RTLD_NEXT, name));
}

}  // namespace

void count_from_here() noexcept {
  counts = {};
  counting = true;
}

Counts count_until_here() noexcept {
  counting = false;
  return counts;
}

}  // namespace pastern::bench

using pastern::bench::allocated;
using pastern::bench::locked;
using pastern::bench::next;

// A sanitizer brings a malloc and locks of its own: then nothing is counted, and the bench says so by its own
// check.
#if defined(__SANITIZE_ADDRESS__) || defined(__SANITIZE_THREAD__)
#define PASTERN_NOT_COUNTED 1
#elif defined(__has_feature)
#if __has_feature(address_sanitizer) || __has_feature(thread_sanitizer) || __has_feature(memory_sanitizer)
#define PASTERN_NOT_COUNTED 1
#endif
#endif

#ifndef PASTERN_NOT_COUNTED
extern "C" {

void* __libc_malloc(std::size_t);
void* __libc_calloc(std::size_t, std::size_t);
void* __libc_realloc(void*, std::size_t);
void* __libc_memalign(std::size_t, std::size_t);

void* malloc(std::size_t size) {
  allocated();
  return __libc_malloc(size);
}
void* calloc(std::size_t count, std::size_t size) {
  allocated();
  return __libc_calloc(count, size);
}
void* realloc(void* at, std::size_t size) {
  allocated();
  return __libc_realloc(at, size);
}
void* memalign(std::size_t alignment, std::size_t size) {
  allocated();
  return __libc_memalign(alignment, size);
}
void* aligned_alloc(std::size_t alignment, std::size_t size) {
  allocated();
  return __libc_memalign(alignment, size);
}
int posix_memalign(void** at, std::size_t alignment, std::size_t size) {
  allocated();
  *at = __libc_memalign(alignment, size);
  return *at == nullptr ? ENOMEM : 0;
}

// One line a lock: count, then call the one that this stands in front of.
#define PASTERN_COUNTED(name, type)                                           \
  int name(type* at) {                                                        \
    locked();                                                                 \
    static const auto real = next(static_cast<int (*)(type*)>(&name), #name); \
    return real(at);                                                          \
  }
#define PASTERN_COUNTED_UNTIL(name, type)                                                             \
  int name(type* at, const struct timespec* until) {                                                  \
    locked();                                                                                         \
    static const auto real = next(static_cast<int (*)(type*, const struct timespec*)>(&name), #name); \
    return real(at, until);                                                                           \
  }

PASTERN_COUNTED(pthread_mutex_lock, pthread_mutex_t)
PASTERN_COUNTED(pthread_mutex_trylock, pthread_mutex_t)
PASTERN_COUNTED_UNTIL(pthread_mutex_timedlock, pthread_mutex_t)
PASTERN_COUNTED(pthread_rwlock_rdlock, pthread_rwlock_t)
PASTERN_COUNTED(pthread_rwlock_wrlock, pthread_rwlock_t)
PASTERN_COUNTED(pthread_cond_signal, pthread_cond_t)
PASTERN_COUNTED(pthread_cond_broadcast, pthread_cond_t)
PASTERN_COUNTED(sem_wait, sem_t)
PASTERN_COUNTED(sem_post, sem_t)
PASTERN_COUNTED(pthread_barrier_wait, pthread_barrier_t)

int pthread_spin_lock(pthread_spinlock_t* at) {
  locked();
  static const auto real =
      next(static_cast<int (*)(pthread_spinlock_t*)>(&pthread_spin_lock), "pthread_spin_lock");
  return real(at);
}
int pthread_cond_wait(pthread_cond_t* at, pthread_mutex_t* mutex) {
  locked();
  static const auto real =
      next(static_cast<int (*)(pthread_cond_t*, pthread_mutex_t*)>(&pthread_cond_wait), "pthread_cond_wait");
  return real(at, mutex);
}

}  // extern "C"
#endif
