// Robots by lanes, tick by tick as tools/train/walk.cpp and hal_stub/robot/simulated_robot.cpp have them for
// one, from the same functions over another scalar. Walks begin together on the ticks of the policy: a lane
// that is free waits for the next (at most one step of the policy).
#pragma once

#include <limits>

#include "tools/packed/functions.h"
#include "tools/packed/gather.h"
#include "tools/packed/lane_site.h"
#include "tools/packed/noise.h"
#include "tools/packed/walk.h"

namespace pastern::packed::PASTERN_LANES_SET {

template <class S>
class LaneWalker final : public Walker {
 public:
  using T = typename S::Constant;
  static constexpr int kLanes = S::kLanes;
  using W = Words<kLanes>;

  explicit LaneWalker(std::shared_ptr<const WalkSettings> settings);
  void stand_up(StandDesk& desk) override;
  void walk(WalkDesk& desk) override;
  [[nodiscard]] int lanes() const override { return kLanes; }

 private:
  static constexpr std::uint32_t kNever = std::numeric_limits<std::uint32_t>::max();
  static constexpr unsigned kAll = (1U << unsigned{kLanes}) - 1U;
  static constexpr std::size_t kMaxWords = 4 * (3 * safety::kMaxJoints / 4 + 2);

  // walk_set.cpp: whole walks.
  void begin();
  void refill(WalkDesk& desk);
  void refill(StandDesk& desk);
  void finish(WalkDesk& desk, unsigned over);
  void finish(StandDesk& desk, unsigned over);
  void put(int lane, const OnMark& robot);
  void put(int lane, const Stood& stood);
  void put_site(int lane, const OnMark& robot);
  void keep(int lane, Stood& stood);
  void park(int lane);
  void make_room(const OnMark& robot);
  void make_room(std::vector<S>& ring, std::uint32_t& rows, std::uint32_t wanted, std::size_t width);
  template <class F>
  void each_on_bus(const OnMark& robot, F&& f);
  void set_end(int lane, std::uint32_t end);

  // walk_tick.h: one tick of all lanes; the lanes that are at their end.
  unsigned tick();
  void step_flawed();
  void look();
  void look_back(const W& late, const W& imu_late);
  [[nodiscard]] W age_of_news() const;
  void steer();
  void rise();
  void command();
  void hear();
  void jitter();
  void correct();
  void push();
  [[nodiscard]] unsigned score();

  const WalkFigures<T>& figures() const noexcept {
    if constexpr (sizeof(T) == 4) return settings_->single;
    if constexpr (sizeof(T) == 8) return settings_->full;
  }
  [[nodiscard]] std::size_t joints() const noexcept { return settings_->joint_count; }
  [[nodiscard]] stub::Seen<S> encoder(std::size_t j) const noexcept {
    return {robot_.drives.rotor_angle[j], robot_.drives.rotor_speed[j]};
  }

  std::shared_ptr<const WalkSettings> settings_;
  stub::RobotState<S> robot_{};
  stub::RobotWork<S> work_{};
  stub::Told<S> told_{};
  stub::SiteFigures<S> site_{};
  LaneSite<S> own_{};
  SensorWords<kLanes> chance_{};
  std::array<W, kMaxWords> words_{};
  JointAngles<S> angle_{};  ///< as the frame has them
  JointSpeeds<S> speed_{};
  Torques<S> torque_{};  ///< of the last tick
  JointTarget<S> target_{};
  BodyEstimate<S> body_{};
  S power_{};
  episode::ReturnSums<S> sums_{};
  S distance_{};
  // Commands on their way, folded (hal_stub/robot/period.h): rows by tick, in them joints.
  std::vector<S> commands_;
  std::uint32_t command_rows_{0};
  W command_delay_{0};
  W acting_{0};       ///< tick of the command that the drives act on
  W command_at_{0};   ///< its place
  W torque_from_{0};  ///< tick of the first command that says torque on
  // Samplings on their way, when a lane's bus is slow: angle, speed, torque of each joint, and the rate.
  std::vector<S> samples_;
  std::uint32_t sample_rows_{0};
  W sample_delay_{0};
  W imu_delay_{0};
  stub::PerDrive<S> seen_angle_{};
  stub::PerDrive<S> seen_speed_{};
  stub::PerDrive<S> seen_torque_{};
  stub::Vec3<S> seen_rate_{};
  bool slow_bus_{false};
  bool flawed_{false};  ///< frames come late or twice
  bool jitters_{false};
  // Rising.
  JointAngles<S> rise_from_{};
  S rise_clock_{};  ///< ticks since the rise began
  bool stands_up_{false};
  bool plane_legs_{false};
  // The lanes.
  std::uint32_t now_{0};  ///< tick
  W placed_{0};           ///< tick of each lane's placing
  S ticks_{};             ///< since then
  std::array<std::uint32_t, kLanes> arrived_{};
  std::array<bool, kLanes> let_go_{};
  std::array<std::uint32_t, kLanes> walk_from_{};
  std::array<std::uint32_t, kLanes> end_{};
  std::uint32_t next_end_{kNever};
  std::array<std::size_t, kLanes> id_{};
  std::array<OnMark, kLanes> mark_{};
  unsigned busy_{0};
  unsigned fell_{0};  ///< in the last tick
  bool more_{true};
  OnMark parked_;  ///< what a lane without work does: it stands
  // The policy.
  policy::Shape<S> shape_;
  policy::Scratch<S> scratch_;
  std::vector<S> parameters_;
};

}  // namespace pastern::packed::PASTERN_LANES_SET
