// Walks by lanes, seen from outside: what a walk begins with, what comes of it, who gives the next. Plain
// numbers and double throughout; compiled for the plain machine. What a walk is, tick by tick, stands in
// tools/train/walk.cpp for one robot and in walk_lanes.h for many at once.
#pragma once

#include <cstdint>
#include <memory>
#include <vector>

#include "hal_stub/robot/frames.h"
#include "hal_stub/robot/model.h"
#include "hal_stub/robot/site.h"
#include "runtime/episode/score.h"
#include "runtime/policy/policy_parts.h"
#include "tools/packed/instruction_set.h"

namespace pastern::packed {

/// Constants of one joint between frame and drive.
template <class C>
struct JointFigures {
  C stiffness{}, damping{};                         ///< of the PD loop
  C hold_stiffness{}, hold_damping{}, hold_most{};  ///< of the drive's own correction
  C peak{}, step{}, angle_min{}, angle_max{};       ///< of the gate (safety/clamps.h)
  C soft_edge{}, soft_speed{}, speed_max{};
  C stance{};
};

/// Everything that walks of one robot and one policy layout share, as numbers of one kind.
template <class C>
struct WalkFigures {
  stub::Figures<C> robot;
  std::array<JointFigures<C>, safety::kMaxJoints> joint{};
  C stance_height{};
  C lane_half_width{};
  C encoder_step{}, encoder_per_step{};
  C rate_range{};
  C step{};  ///< of the body, s
};

/// The same in both kinds, and what is a number of neither.
struct WalkSettings {
  std::shared_ptr<const stub::Model> model;
  policy::Shape<double> shape;
  episode::Weights weights;
  WalkFigures<float> single;
  WalkFigures<double> full;
  double period_s{0};  ///< of the cycle
  std::size_t joint_count{0};
  int substeps{1};
  std::uint32_t parked_ticks{0};  ///< before a walk: on the mark, then up, then standing
  std::uint32_t rise_ticks{0};
  std::uint32_t stand_ticks{0};
  std::uint32_t ticks{0};                ///< of a walk
  std::uint32_t ticks_per_step{1};       ///< of the policy
  std::uint32_t timeout_ticks{0};        ///< without a new command, before the drives damp by themselves
  std::uint32_t let_go_ticks{0};         ///< and before they let go
  std::vector<policy::GaitPhase> phase;  ///< by step of the policy
};

/// Robot and policy are checked (proto/files). Null with a line in `error` when the simulated robot cannot be
/// this robot.
[[nodiscard]] std::shared_ptr<const WalkSettings> walk_settings(const v1::Robot& robot,
                                                                const v1::Policy& policy, double walk_s,
                                                                std::string& error,
                                                                double longest_step_s = 0.001);

/// A robot on its mark at a site. Faults of the site have no effect here: walks by lanes have none.
struct OnMark {
  stub::RobotState<double> state;
  stub::SiteFigures<double> site;
  bool lying{true};
  stub::Vec3<double> push{};                 ///< force, world axes, N
  std::uint32_t push_first{0}, push_end{0};  ///< ticks since placed in which it acts; the end is not one
  stub::Rotation<double> imu_axes{};
  stub::Vec3<double> rate_bias{};
  std::array<double, safety::kMaxJoints> zero_offset{};
  double angle_noise{0}, speed_noise{0}, torque_noise{0}, rate_noise{0};  ///< sd at this site
  double roll_error{0}, pitch_error{0};  ///< of the estimated attitude, for the whole walk
  std::uint64_t seed{0};
  std::uint64_t draw{0};
  std::uint32_t sensor_delay{0};   ///< ticks
  std::uint32_t imu_delay{0};      ///< ticks
  std::uint32_t oldest_sample{0};  ///< ticks, that a frame may tell of
  stub::FrameFlaws flaws;
  std::uint32_t command_delay{0};  ///< ticks, without jitter
  std::uint32_t longest_delay{0};  ///< ticks, with all the jitter there may be
  double command_delay_s{0}, command_jitter_s{0};
};

/// Lying in the parked pose at `site`, with all chance of (seed, draw).
[[nodiscard]] OnMark on_mark(const WalkSettings& settings, const stub::Site& site, std::uint64_t seed,
                             std::uint64_t draw);

/// Put on its feet in the stance, by the same chance; heat and charge stay.
void put_on_feet(const WalkSettings& settings, const stub::Site& site, OnMark& robot);

/// Delay of the command that would arrive in tick `tick` since placed, with jitter, ticks.
[[nodiscard]] std::uint32_t jittered_delay(const WalkSettings& settings, const OnMark& robot,
                                           std::uint32_t tick);

/// A robot that has risen and stands: all that a walk of it depends on but the policy. Made by one walker,
/// good for any of the same instructions and numbers.
struct Stood {
  OnMark mark;
  std::uint32_t ticks{0};        ///< since placed
  std::uint32_t acting_age{0};   ///< of the command that the drives act on, ticks
  std::uint32_t arrived_age{0};  ///< since it arrived
  bool let_go{false};
  std::vector<double> numbers;  ///< state, and what is on the bus
};

struct WalkEnd {
  episode::ReturnSums<double> sums;
  bool fell{false};
  double distance_m{0};
  std::uint32_t ticks{0};
};

/// Robots to bring from their marks to a stand. One walker calls a desk from one thread; `id` comes back with
/// the end.
class StandDesk {
 public:
  virtual ~StandDesk() = default;
  /// False when there is none left.
  virtual bool next(OnMark& robot, std::size_t& id) = 0;
  /// The robot lies where it should stand; `robot` has its heat and charge. It will try again as `robot` is
  /// left: as a rule put_on_feet(), and what comes of that counts.
  virtual void again(std::size_t id, OnMark& robot) = 0;
  virtual void done(std::size_t id, Stood&& stood) = 0;
};

/// What `stood` and `parameters` point to must stay until the walk is done.
struct WalkTask {
  const Stood* stood{nullptr};
  const double* parameters{nullptr};
};

/// Walks to do.
class WalkDesk {
 public:
  virtual ~WalkDesk() = default;
  virtual bool next(WalkTask& task, std::size_t& id) = 0;
  virtual void done(std::size_t id, const WalkEnd& end) = 0;
};

/// Moves as many robots at once as a register has lanes. Not thread-safe; what comes of a robot does not
/// depend on its lane, on its neighbours or on the order.
class Walker {
 public:
  virtual ~Walker() = default;
  virtual void stand_up(StandDesk& desk) = 0;
  virtual void walk(WalkDesk& desk) = 0;
  [[nodiscard]] virtual int lanes() const = 0;
};

enum class Numbers : std::uint8_t { single, full };

/// `set` is one of sets_here().
[[nodiscard]] std::unique_ptr<Walker> make_walker(std::shared_ptr<const WalkSettings> settings,
                                                  InstructionSet set = widest_set(),
                                                  Numbers numbers = Numbers::single);

}  // namespace pastern::packed
