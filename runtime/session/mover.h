// How a session gets the robot to move, whatever the pace: at stepped pace the caller's thread runs the
// cycle, at wall pace the cycle has a thread of its own and orders and reports pass through single-producer
// single-consumer queues. Session thread only.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <string>

#include "runtime/session/cycle.h"

namespace pastern::session {

class Mover {
 public:
  using Serve = std::function<void()>;

  virtual ~Mover() = default;
  /// Runs one motion to its end. `serve` (may be empty) is called some hundred times a second meanwhile at
  /// wall pace, not at stepped pace; it must not move the robot itself.
  virtual MotionResult move(Motion motion, double duration_s, const Serve& serve) = 0;
  /// The robot stands on its start mark again: a simulated one is put there (what is random about that is a
  /// function of `draw`), the gate's filters start anew. Parked only. False with a reason in `words`.
  virtual bool set_down(std::uint64_t draw, std::string& words) = 0;
  /// Asks the gate to release, after one tick that sees the flags as they are: a stop that is still set
  /// stands in the way (clear_stops). False with a reason in `words`.
  virtual bool release(std::string& words) = 0;
  [[nodiscard]] virtual CycleReport report() = 0;
  virtual void load(const Parameters& parameters) = 0;
  virtual void change_policy(const v1::Policy& policy) = 0;
  [[nodiscard]] virtual v1::CarriedState save() = 0;
  [[nodiscard]] virtual bool restore(const v1::CarriedState& state) = 0;
  [[nodiscard]] virtual bool simulated() const = 0;
  [[nodiscard]] virtual Pace pace() const = 0;
  [[nodiscard]] virtual Signals& signals() = 0;
  /// SCHED_FIFO or why not, in words for people.
  [[nodiscard]] virtual std::string scheduling() const = 0;
};

/// What an operator's release clears before the gate is asked: the stops that had been asked for when the
/// operator released. False, and a stop stands, when another has come since.
[[nodiscard]] bool clear_stops(Signals& signals, std::uint64_t stops_seen);
/// What a release by the program itself may clear: its own stop, never a person's.
void clear_own_stop(Signals& signals);
/// Why the gate did not release, in words.
[[nodiscard]] std::string release_refused(const CycleReport& report);

/// `cycle` must outlive the mover and be made for the same pace.
[[nodiscard]] std::unique_ptr<Mover> make_stepped_mover(Cycle& cycle);

struct ThreadSettings {
  int cpu{-1};       ///< -1: not pinned
  int priority{80};  ///< of SCHED_FIFO
};

/// Starts the cycle thread: memory locked and stack pre-faulted, SCHED_FIFO, pinned when asked; what is not
/// permitted is left out and said in scheduling(). Sleeps to absolute times; a tick whose time has passed
/// when the thread wakes is left out and counted (the rule of cyclictest). Without an order the robot is
/// parked.
[[nodiscard]] std::unique_ptr<Mover> make_wall_mover(Cycle& cycle, const ThreadSettings& settings);

}  // namespace pastern::session
