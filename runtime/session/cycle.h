// One tick strung together: read -> estimate -> policy -> PD -> GATE -> write -> record. At wall pace it runs
// in the cycle thread; at stepped pace, and in rehearsal and benches, whoever calls run_order() is that
// thread.
#pragma once

#include <atomic>
#include <cstdint>
#include <memory>
#include <optional>
#include <string>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "runtime/hal/drives.h"
#include "runtime/types/episode.h"
#include "safety/gate.h"

namespace pastern::session {

/// The gate's limits from a checked robot file.
[[nodiscard]] safety::Limits limits_of(const v1::Robot& robot);

/// Flags that other threads set. A stop needs nothing but a store here.
struct Signals {
  std::atomic<bool> stop{false};
  std::atomic<bool> halt{false};
  std::atomic<bool> baton_lost{false};
  std::atomic<bool> internal_stop{false};
  std::atomic<std::uint64_t> stopped_commands{
      0};  ///< ticks written with a stop sequence running or torque off
};

/// What the cycle is to do. Everything that takes time is an order.
enum class Motion : std::uint8_t { parked, rise, stand, walk, settle, lower };

/// Outcome of a motion: how it ended, and for a walk its score, summary and trace.
struct MotionResult {
  bool completed{false};
  bool tripped{false};
  safety::Trip trip;
  Outcome outcome{Outcome::completed};
  EpisodeReturn terms;
  v1::EpisodeSummary summary;
  v1::Trace trace;
};

/// Live figures for status, copied by the session thread from atomics or between orders.
struct CycleFigures {
  std::uint64_t ticks{0};
  std::uint64_t overruns{0};
  double pack_voltage_v{0};
  double winding_max_c{0};
};

class Cycle {
 public:
  /// All checked. The cycle owns none of the arguments but the drives.
  Cycle(const v1::Robot& robot, const v1::Policy& policy, std::unique_ptr<hal::Drives> drives);
  ~Cycle();

  [[nodiscard]] Signals& signals() noexcept;
  [[nodiscard]] hal::Drives& drives() noexcept;
  [[nodiscard]] safety::Gate& gate() noexcept;

  /// Between orders: parameters of the next walk.
  void load(const Parameters& parameters) noexcept;
  /// Runs one motion to its end at the caller's pace: stepped = no sleeping; wall = called by the cycle
  /// thread only.
  [[nodiscard]] MotionResult run(Motion motion, double duration_s);
  [[nodiscard]] CycleFigures figures() const noexcept;

  /// One tick, for benches: everything between read and write included. `due` is when it was due.
  void tick(safety::TimeNs due) noexcept;

 private:
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::session
