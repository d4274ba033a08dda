// One tick strung together: read -> estimate -> policy -> PD -> GATE -> write -> record. At wall pace it runs
// in the cycle thread (mover.h); at stepped pace, and in rehearsal and benches, whoever calls run() is that
// thread. A tick allocates nothing, takes no lock, throws nothing and makes no system call but the clock's.
#pragma once

#include <atomic>
#include <cstdint>
#include <memory>
#include <string>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "runtime/hal/drives.h"
#include "runtime/types/body.h"
#include "runtime/types/episode.h"
#include "safety/gate.h"

namespace pastern::session {

/// The gate's limits from a checked robot file.
[[nodiscard]] safety::Limits limits_of(const v1::Robot& robot);

/// wall: real time. stepped: simulated time advances by one period with each tick and only then.
enum class Pace : std::uint8_t { stepped, wall };

/// Flags that other threads set. A stop needs nothing but a store here.
struct Signals {
  std::atomic<bool> stop{false};
  std::atomic<bool> halt{false};
  std::atomic<bool> baton_lost{false};  ///< judged within a tick at wall pace only; stepped: between orders
  std::atomic<bool> internal_stop{false};
  /// Stops and halts that people have asked for; risen before the flag is set. Tells a release which of them
  /// its operator had seen.
  std::atomic<std::uint64_t> stops_asked{0};
  std::atomic<std::uint64_t> stopped_commands{
      0};  ///< ticks written with a stop sequence running or torque off
};

/// What the cycle is to do. Everything that takes time is an order.
///   parked  torque off                          rise    present pose -> stance, over the robot file's rise_s
///   stand   holds the stance                    walk    the policy, from the stance
///   settle  last target -> stance, settle_s     lower   last target -> lying pose over rise_s, then torque
///   off
/// Out of a walk the settling is a running out: the policy goes on for settle_s while its share of the target
/// falls to nothing. Feet that stopped at once would throw the trunk over them.
enum class Motion : std::uint8_t { parked, rise, stand, walk, settle, lower };

/// Outcome of a motion: how it ended, and for a walk its score, summary and trace.
struct MotionResult {
  bool completed{false};  ///< ran for its whole time without a trip
  bool tripped{false};
  safety::Trip trip;
  /// Of a walk: completed; fell (the robot tilted or sank, or its own motion broke a limit); left_lane;
  /// voided (a trip that has nothing to do with how it walked).
  Outcome outcome{Outcome::completed};
  bool fall_estimated{false};  ///< the estimate saw the fall before the gate did and asked it for a stop
  BodyEstimate<> fall_body;    ///< as it was then
  EpisodeReturn terms;
  v1::EpisodeSummary summary;
  v1::Trace trace;
};

/// A trip that the walk itself caused counts as a fall; every other one makes the walk void.
[[nodiscard]] bool caused_by_walking(safety::Cause cause) noexcept;

/// Where the cycle is, by value: what the session thread knows of it.
struct CycleReport {
  std::uint64_t ticks{0};
  std::uint64_t missed{0};    ///< ticks left out because the one before woke too late
  std::uint64_t overruns{0};  ///< ticks that began later than the robot file's overrun limit allows
  safety::TimeNs now;
  Motion motion{Motion::parked};
  bool done{true};
  safety::Phase phase{safety::Phase::armed};
  safety::Hold hold{safety::Hold::none};
  safety::Trip trip;
  double pack_voltage_v{0};
  double pack_current_a{0};
  double winding_max_c{0};
  int joint_count{0};  ///< of the last frame; 0 before the first
  JointAngles<> angle;
  safety::Temperatures<> winding;
  bool targeted{false};  ///< `target` is being followed: armed, and not parked
  JointAngles<> target;
  safety::PerJoint<safety::Celsius> thermal;  ///< the gate's thermal memory, fractions of the limit
};

class Cycle {
 public:
  /// Robot and policy are checked ones (proto/files). The cycle owns the drives.
  Cycle(const v1::Robot& robot, const v1::Policy& policy, std::unique_ptr<hal::Drives> drives,
        Pace pace = Pace::stepped);
  ~Cycle();
  Cycle(const Cycle&) = delete;
  Cycle& operator=(const Cycle&) = delete;

  [[nodiscard]] Signals& signals() noexcept;
  [[nodiscard]] hal::Drives& drives() noexcept;
  [[nodiscard]] safety::Gate& gate() noexcept;
  [[nodiscard]] double period_s() const noexcept;

  /// Between walks (once settled), from any one thread: parameters of the next walk; finite and of the
  /// policy's size.
  void load(const Parameters& parameters) noexcept;
  /// Between walks (once settled): another policy altogether. Allocates.
  void change_policy(const v1::Policy& policy);

  /// begin(), ticks until done(), result(): the parts of run(). begin() and tick() belong to the cycle's
  /// thread; result() may be called by another once done() has been passed on. After its end a motion goes on
  /// safely for as long as nobody asks for another: rise, walk and settle end in standing, lower in parked.
  void begin(Motion motion, double duration_s) noexcept;
  /// `due` is when this tick was due, CLOCK_MONOTONIC; not looked at when stepped.
  void tick(safety::TimeNs due) noexcept;
  [[nodiscard]] bool done() const noexcept;
  [[nodiscard]] MotionResult result() const;

  /// Runs one motion to its end without sleeping. `duration_s` counts for parked, stand and walk.
  [[nodiscard]] MotionResult run(Motion motion, double duration_s);

  /// The robot was put down elsewhere: filters start anew, latches stay. Between motions.
  void set_down() noexcept;
  void count_missed(std::uint64_t ticks) noexcept;
  [[nodiscard]] CycleReport report() const noexcept;
  /// Of report(), for whoever asks every tick.
  [[nodiscard]] Motion motion() const noexcept;
  [[nodiscard]] safety::TimeNs now() const noexcept;

  /// What carries over between walks and over a restart: the gate's thermal memory, tick and time, and what a
  /// simulated robot saves of itself. Between motions.
  [[nodiscard]] v1::CarriedState save();
  /// False when a simulated robot refuses its part. `clock` false: only the thermal memory (wall pace, real
  /// drives).
  [[nodiscard]] bool restore(const v1::CarriedState& state, bool clock);

 private:
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::session
