// System calls of a child process, watched from outside by ptrace(2).
#pragma once

#include <functional>
#include <map>
#include <string>

namespace pastern::bench {

struct Watched {
  std::map<long, long> calls;  ///< system call number -> how often, in the cycle's thread between the marks
  long marks{0};
  bool ended_well{false};
  std::string end{"it was lost"};  ///< exit status or signal, in words
};

/// In the child: thread `mark_here` is called from any thread and is itself seen from outside.
void mark_begin(int cycle_thread);
void mark_end();

/// Forks, runs `work` in the child under ptrace, and returns what the thread named by mark_begin() called
/// until mark_end(). `error` says why when it could not.
[[nodiscard]] Watched watch_calls(const std::function<void()>& work, std::string& error);

/// "clock_nanosleep" for its number; "call 230" for those it does not know.
[[nodiscard]] std::string call_name(long number);

}  // namespace pastern::bench
