// A small system call tracer: every thread of one child, counted for one of them.
#include "tests/bench/rig/calls.h"

#include <sys/ptrace.h>
#include <sys/syscall.h>
#include <sys/types.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cerrno>
#include <csignal>
#include <cstring>

// ptrace_syscall_info stands in the kernel's header, which clashes with the C library's.
#ifndef PTRACE_GET_SYSCALL_INFO
#define PTRACE_GET_SYSCALL_INFO static_cast<__ptrace_request>(0x420e)
#endif

namespace pastern::bench {
namespace {

// A mark is a system call that nobody else makes: close of a file descriptor that cannot be open.
constexpr int kBeginMark = -7741;
constexpr int kEndMark = -7742;

constexpr int kOptions = PTRACE_O_TRACESYSGOOD | PTRACE_O_TRACECLONE | PTRACE_O_EXITKILL;
constexpr int kSyscallStop = SIGTRAP | 0x80;

class Tracer {
 public:
  explicit Tracer(pid_t child) : child_(child) {}

  Watched follow() {
    int status = 0;
    pid_t thread = 0;
    while ((thread = waitpid(-1, &status, __WALL)) > 0) {
      if (WIFEXITED(status) || WIFSIGNALED(status)) {
        if (thread == child_) {
          watched_.ended_well = WIFEXITED(status) && WEXITSTATUS(status) == 0;
          watched_.end = WIFEXITED(status) ? "exit status " + std::to_string(WEXITSTATUS(status))
                                           : "signal " + std::to_string(WTERMSIG(status));
          return watched_;
        }
        continue;
      }
      resume(thread, status);
    }
    return watched_;
  }

 private:
  void resume(pid_t thread, int status) {
    int deliver = 0;
    const int signal = WSTOPSIG(status);
    if (signal == kSyscallStop) {
      look(thread);
    } else if (signal != SIGTRAP && signal != SIGSTOP) {
      deliver = signal;
    }
    (void)ptrace(PTRACE_SYSCALL, thread, nullptr, deliver);
  }

  void look(pid_t thread) {
    __ptrace_syscall_info info{};
    if (ptrace(PTRACE_GET_SYSCALL_INFO, thread, sizeof info, &info) <= 0) return;
    if (info.op != PTRACE_SYSCALL_INFO_ENTRY) return;
    const auto number = static_cast<long>(info.entry.nr);
    const auto first = static_cast<int>(info.entry.args[0]);
    if (number == SYS_close && first == kBeginMark) {
      watching_ = static_cast<pid_t>(info.entry.args[1]);
      ++watched_.marks;
    } else if (number == SYS_close && first == kEndMark) {
      watching_ = 0;
      ++watched_.marks;
    } else if (thread == watching_) {
      ++watched_.calls[number];
    }
  }

  pid_t child_;
  pid_t watching_{0};
  Watched watched_;
};

}  // namespace

void mark_begin(int cycle_thread) { (void)syscall(SYS_close, kBeginMark, cycle_thread); }
void mark_end() { (void)syscall(SYS_close, kEndMark, 0); }

Watched watch_calls(const std::function<void()>& work, std::string& error) {
  const pid_t child = fork();
  if (child == 0) {
    if (ptrace(PTRACE_TRACEME, 0, nullptr, nullptr) != 0) _exit(3);
    (void)raise(SIGSTOP);
    work();
    _exit(0);
  }
  int status = 0;
  if (child < 0 || waitpid(child, &status, 0) != child || !WIFSTOPPED(status)) {
    error = std::string("cannot trace a child: ") + std::strerror(errno);
    return {};
  }
  (void)ptrace(PTRACE_SETOPTIONS, child, nullptr, kOptions);
  (void)ptrace(PTRACE_SYSCALL, child, nullptr, nullptr);
  Watched watched = Tracer(child).follow();
  if (watched.marks != 2) error = "the traced child was not seen to begin and end its walk";
  if (!watched.ended_well) error = "the traced child did not end well: " + watched.end;
  return watched;
}

std::string call_name(long number) {
  static const std::map<long, std::string> kNames{{SYS_clock_nanosleep, "clock_nanosleep"},
                                                  {SYS_clock_gettime, "clock_gettime"},
                                                  {SYS_futex, "futex"},
                                                  {SYS_write, "write"},
                                                  {SYS_read, "read"},
                                                  {SYS_mmap, "mmap"},
                                                  {SYS_munmap, "munmap"},
                                                  {SYS_brk, "brk"},
                                                  {SYS_madvise, "madvise"},
                                                  {SYS_nanosleep, "nanosleep"},
                                                  {SYS_sched_yield, "sched_yield"},
                                                  {SYS_sendto, "sendto"},
                                                  {SYS_recvfrom, "recvfrom"},
                                                  {SYS_ioctl, "ioctl"}};
  const auto at = kNames.find(number);
  return at == kNames.end() ? "call " + std::to_string(number) : at->second;
}

}  // namespace pastern::bench
