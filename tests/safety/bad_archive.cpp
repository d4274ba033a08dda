// Everything that the gate's archive must not contain; built only to see that archive.sh finds it.
#include <mutex>
#include <stdexcept>
#include <vector>

namespace pastern::safety {

struct Dispatches {
  virtual ~Dispatches() = default;
  virtual int answer() { return 1; }
};

std::mutex& lock_of() {
  static std::mutex mutex;
  return mutex;
}

int bad(int n) {
  const std::lock_guard<std::mutex> guard(lock_of());
  if (n < 0) throw std::runtime_error("negative");
  std::vector<int> heap(static_cast<std::size_t>(n) + 1);
  Dispatches dispatches;
  Dispatches* volatile at = &dispatches;
  return heap[0] + at->answer();
}

}  // namespace pastern::safety
