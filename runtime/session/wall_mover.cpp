// The cycle thread and the queues to it. The cycle never waits for the session: it looks into the order queue
// once a tick and drops a report when the report queue is full (the next one says as much or more).
#include <pthread.h>
#include <sched.h>
#include <sys/mman.h>
#include <sys/resource.h>
#include <time.h>
#include <unistd.h>

#include <atomic>
#include <boost/lockfree/spsc_queue.hpp>
#include <cerrno>
#include <chrono>
#include <cstring>
#include <thread>

#include "runtime/session/mover.h"

namespace pastern::session {
namespace {

constexpr std::int64_t kReportEvery_ns = 10'000'000;
constexpr std::size_t kStackToFault = 256 * 1024;
constexpr std::int64_t kNsPerS = 1'000'000'000;
constexpr auto kPoll = std::chrono::microseconds(500);
constexpr auto kAnswerWithin = std::chrono::seconds(5);

/// From the session to the cycle.
struct CycleOrder {
  enum class Kind : std::uint8_t { move, set_down, release };
  Kind kind{Kind::move};
  Motion motion{Motion::parked};
  double duration_s{0};
  std::uint64_t draw{0};
  std::uint64_t number{0};
};

/// From the cycle to the session.
struct Report {
  CycleReport cycle;
  std::uint64_t answered{0};  ///< number of the last order that has ended
  bool accepted{false};       ///< how it ended: set_down and release may be refused
};

safety::TimeNs monotonic_now() noexcept {
  timespec now{};
  clock_gettime(CLOCK_MONOTONIC, &now);
  return {static_cast<std::int64_t>(now.tv_sec) * kNsPerS + now.tv_nsec};
}

void sleep_until(safety::TimeNs due) noexcept {
  const timespec at{static_cast<time_t>(due.value / kNsPerS), static_cast<long>(due.value % kNsPerS)};
  while (clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &at, nullptr) == EINTR) {
  }
}

// Touches every page of the stack that the cycle may use, so that none is missing later.
void fault_stack() noexcept {
  volatile unsigned char stack[kStackToFault];
  unsigned sum = 0;
  for (std::size_t i = 0; i < kStackToFault; i += 1024) {
    stack[i] = 0;
    sum += stack[i];
  }
  (void)sum;
}

// With a limit on locked memory, locking what is to come would make later allocations fail: a worse fate than
// a page fault.
bool lock_memory() noexcept {
  rlimit limit{};
  const bool unlimited =
      geteuid() == 0 || (getrlimit(RLIMIT_MEMLOCK, &limit) == 0 && limit.rlim_cur == RLIM_INFINITY);
  return mlockall(unlimited ? MCL_CURRENT | MCL_FUTURE : MCL_CURRENT) == 0;
}

std::string settle_thread(const ThreadSettings& settings) {
  std::string words;
  sched_param priority{};
  priority.sched_priority = settings.priority;
  const int scheduled = pthread_setschedparam(pthread_self(), SCHED_FIFO, &priority);
  words = scheduled == 0 ? "SCHED_FIFO priority " + std::to_string(settings.priority)
                         : std::string("not real-time: SCHED_FIFO refused (") + std::strerror(scheduled) +
                               "), ticks may be late";
  if (!lock_memory()) {
    words += std::string("; memory not locked (") + std::strerror(errno) + ")";
  }
  if (settings.cpu >= 0) {
    cpu_set_t cpus;
    CPU_ZERO(&cpus);
    CPU_SET(static_cast<std::size_t>(settings.cpu), &cpus);
    const int pinned = pthread_setaffinity_np(pthread_self(), sizeof cpus, &cpus);
    words += pinned == 0
                 ? "; on cpu " + std::to_string(settings.cpu)
                 : "; not pinned to cpu " + std::to_string(settings.cpu) + " (" + std::strerror(pinned) + ")";
  }
  fault_stack();
  return words;
}

class WallMover final : public Mover {
 public:
  WallMover(Cycle& cycle, const ThreadSettings& settings)
      : cycle_(cycle),
        simulated_(cycle.drives().simulated()),
        period_ns_(static_cast<std::int64_t>(cycle.period_s() * 1e9 + 0.5)) {
    thread_ = std::thread([this, settings] { live(settings); });
    while (!ready_.load(std::memory_order_acquire)) std::this_thread::sleep_for(kPoll);
  }
  // Whatever made the program end, the robot is not left standing to fall when the drives time out.
  ~WallMover() override {
    cycle_.signals().internal_stop.store(true);
    const auto until = std::chrono::steady_clock::now() + kAnswerWithin;
    while (report().phase != safety::Phase::off && std::chrono::steady_clock::now() < until) {
      std::this_thread::sleep_for(kPoll);
    }
    quit_.store(true, std::memory_order_release);
    thread_.join();
  }
  WallMover(const WallMover&) = delete;
  WallMover& operator=(const WallMover&) = delete;

  MotionResult move(Motion motion, double duration_s, const Serve& serve) override {
    CycleOrder order;
    order.motion = motion;
    order.duration_s = duration_s;
    give(order);
    while (!answered()) {
      if (serve) serve();
      std::this_thread::sleep_for(kPoll);
    }
    return cycle_.result();
  }

  bool set_down(std::uint64_t draw, std::string& words) override {
    CycleOrder order;
    order.kind = CycleOrder::Kind::set_down;
    order.draw = draw;
    give(order);
    if (wait_for_answer() && last_.accepted) return true;
    words = "the simulated robot was not put back on its mark";
    return false;
  }

  bool release(std::string& words) override {
    CycleOrder order;
    order.kind = CycleOrder::Kind::release;
    give(order);
    if (wait_for_answer() && last_.accepted) return true;
    words = release_refused(last_.cycle);
    return false;
  }

  CycleReport report() override {
    drain();
    return last_.cycle;
  }
  // The policy is the cycle's only while it walks and settles; parked, nothing in a tick looks at it.
  void load(const Parameters& parameters) override { cycle_.load(parameters); }
  void change_policy(const v1::Policy& policy) override { cycle_.change_policy(policy); }
  // Real drives, and a simulated robot in a process of its own, keep their state themselves; the thermal
  // memory is the gate's.
  v1::CarriedState save() override {
    drain();
    v1::CarriedState state;
    state.set_ticks(last_.cycle.ticks);
    state.set_time_ns(last_.cycle.now.value);
    for (const double share : last_.cycle.thermal.values) state.add_thermal(share);
    return state;
  }
  bool restore(const v1::CarriedState& state) override {
    (void)state;  // done before the thread starts, see Cycle::restore
    return true;
  }
  bool simulated() const override { return simulated_; }
  Pace pace() const override { return Pace::wall; }
  Signals& signals() override { return cycle_.signals(); }
  std::string scheduling() const override { return scheduling_; }

 private:
  // Session thread.
  void give(CycleOrder& order) {
    order.number = ++number_;
    while (!orders_.push(order)) std::this_thread::sleep_for(kPoll);
  }
  void drain() {
    Report report;
    while (reports_.pop(report)) last_ = report;
  }
  [[nodiscard]] bool answered() {
    drain();
    return last_.answered >= number_;
  }
  [[nodiscard]] bool wait_for_answer() {
    const auto until = std::chrono::steady_clock::now() + kAnswerWithin;
    while (!answered() && std::chrono::steady_clock::now() < until) std::this_thread::sleep_for(kPoll);
    return last_.answered >= number_;
  }

  // Cycle thread.
  void live(const ThreadSettings& settings) {
    scheduling_ = settle_thread(settings);
    safety::TimeNs due = monotonic_now();
    ready_.store(true, std::memory_order_release);
    while (!quit_.load(std::memory_order_acquire)) {
      due.value += period_ns_;
      sleep_until(due);
      const safety::TimeNs woke = monotonic_now();
      const bool late_on_purpose = take_orders();
      if (late_on_purpose) due = monotonic_now();
      cycle_.tick(due);
      tell();
      const safety::TimeNs reference = late_on_purpose ? due : woke;
      std::uint64_t missed = 0;
      while (due.value + period_ns_ < reference.value) {
        due.value += period_ns_;
        ++missed;
      }
      if (missed > 0) cycle_.count_missed(missed);
    }
  }

  // True when an order took its time with the robot parked: the schedule starts anew.
  [[nodiscard]] bool take_orders() noexcept {
    CycleOrder order;
    if (releasing_ || !orders_.pop(order)) return false;
    current_ = order;
    switch (order.kind) {
      case CycleOrder::Kind::move:
        cycle_.begin(order.motion, order.duration_s);
        return false;
      case CycleOrder::Kind::set_down:
        answer(!simulated_ || cycle_.drives().carry_back(order.draw));
        cycle_.set_down();
        return true;
      case CycleOrder::Kind::release:
        releasing_ = true;  // asked after this tick, which sees the cleared flags
        return false;
    }
    return false;
  }

  void answer(bool accepted) noexcept {
    mine_.answered = current_.number;
    mine_.accepted = accepted;
    told_at_.value = 0;
  }

  void tell() noexcept {
    if (releasing_) {
      releasing_ = false;
      answer(cycle_.gate().release());
    }
    if (mine_.answered != current_.number && cycle_.done()) answer(true);
    const bool event = cycle_.gate().phase() != mine_.cycle.phase || cycle_.motion() != mine_.cycle.motion;
    if (!event && cycle_.now().value - told_at_.value < kReportEvery_ns) return;
    mine_.cycle = cycle_.report();
    if (reports_.push(mine_)) told_at_ = mine_.cycle.now;
  }

  Cycle& cycle_;
  const bool simulated_;
  const std::int64_t period_ns_;
  boost::lockfree::spsc_queue<CycleOrder, boost::lockfree::capacity<8>> orders_;
  boost::lockfree::spsc_queue<Report, boost::lockfree::capacity<64>> reports_;
  std::atomic<bool> quit_{false};
  std::atomic<bool> ready_{false};
  std::string scheduling_;  // written before ready_

  // Session thread's own.
  std::uint64_t number_{0};
  Report last_;

  // Cycle thread's own.
  CycleOrder current_;
  bool releasing_{false};
  Report mine_;
  safety::TimeNs told_at_;

  std::thread thread_;
};

}  // namespace

std::unique_ptr<Mover> make_wall_mover(Cycle& cycle, const ThreadSettings& settings) {
  return std::make_unique<WallMover>(cycle, settings);
}

}  // namespace pastern::session
