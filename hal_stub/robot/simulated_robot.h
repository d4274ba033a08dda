// One simulated robot: body, ground, drives, pack, sensors. Not thread-safe; one object a thread. After
// construction nothing allocates. Random numbers are a pure function of (seed, draw, tick since placed): same
// calls, same bits.
//
// Use from training and rehearsal:
//   const auto model = Model::make(robot_file.robot(), error);           // constant, shared by all threads
//   Site site = nominal_site(*model);  site.friction = 0.5; ...           // or site_of(scenario, *model)
//   SimulatedRobot robot(model, site, seed);                              // allocates; then again and again:
//   robot.renew(site, seed);                                              // a fresh robot (cold, full) at
//   another site robot.place_standing(draw);                                           // in stance on the
//   start mark, torque on hold for (each tick) {
//     if (robot.read(frame)) ... estimator, policy, PD, gate ...          // frame: what real sensors would
//     say robot.command(torques, true); robot.step(); // one period of the cycle (1/cycle_hz) if
//     (robot.truth().fallen) break;
//   }
#pragma once

#include <cstdint>
#include <memory>
#include <string>
#include <vector>

#include "hal_stub/robot/advance.h"
#include "hal_stub/robot/frames.h"
#include "hal_stub/robot/model.h"
#include "hal_stub/robot/period.h"
#include "hal_stub/robot/robot_state.h"
#include "hal_stub/robot/site.h"
#include "safety/frames.h"

namespace pastern::stub {

/// What is really so, in SI units and world axes unless said otherwise. Never reaches the onboard program.
struct Truth {
  std::array<double, 4> attitude_wxyz{1, 0, 0, 0};  ///< body to world
  std::array<double, 3> position_m{};               ///< of the trunk frame's origin
  std::array<double, 3> velocity_m_per_s{};         ///< of that point
  std::array<double, 3> rate_rad_per_s{};           ///< body axes
  double roll_rad{0};
  double pitch_rad{0};
  double yaw_rad{0};
  double tilt_rad{0};         ///< angle of the body's z axis from vertical
  double height_m{0};         ///< of the trunk frame's origin over the ground below it
  bool other_contact{false};  ///< a part other than a foot touches the ground
  bool fallen{false};  ///< tilt over 34 degrees, height under half the stance's, or other_contact (settings
                       ///< of the return)
  double power_w{0};   ///< sum of |torque * joint speed|
};

/// What the drives do: nothing, what they are told, or damp by themselves because commands have stopped.
enum class TorqueMode : std::uint8_t { off = 0, on, damping };

class SimulatedRobot {
 public:
  SimulatedRobot(std::shared_ptr<const Model> model, const Site& site, std::uint64_t seed);

  /// A new robot at another site: clock at zero, pack and windings as the site says, lying on its mark. No
  /// allocation unless the site's delays are longer than any before.
  void renew(const Site& site, std::uint64_t seed);

  /// On the start mark in the stance, feet on the ground, at rest, drives holding nothing. Heat, charge and
  /// clock stay. The scatter (each joint, heading) and the push of this walk are drawn from `draw`.
  void place_standing(std::uint64_t draw);
  /// The same, lying in the parked pose; the push then comes after the robot has had time to rise.
  void place_lying(std::uint64_t draw);

  /// Sent now, in answer to the frame that read() gave last; the drives act on it after the bus's delay.
  /// Non-finite torque counts as zero. Each drive corrects the torque by its own encoder for what its joint
  /// has moved since that frame, with the joint's stiffness and damping of the robot file: a late bus then
  /// delays the targets and does not shake the joints (common practice, no source). The gate's peak torque of
  /// the joint bounds the sum, whatever the correction says.
  void command(const safety::Torques<>& torque, bool torque_on);
  /// One period of the cycle. Without a command for `drive_timeout_s` the drives damp, 0.5 s later they let
  /// go, and then stay off until they have been told torque off.
  void step();
  /// Newest frame. False when there is none since the last call (lost frames); `frame` is then unchanged.
  [[nodiscard]] bool read(safety::SensorFrame& frame);
  /// The bus's own state: false while a BUS_BROKEN fault lasts.
  [[nodiscard]] bool bus_sound() const;

  [[nodiscard]] Truth truth() const;
  [[nodiscard]] bool fallen() const;             ///< cheaper than truth().fallen
  [[nodiscard]] TorqueMode torque_mode() const;  ///< in the last step
  [[nodiscard]] double time_s() const;
  [[nodiscard]] const Model& model() const { return *model_; }
  [[nodiscard]] const Site& site() const { return site_; }
  [[nodiscard]] const RobotState<double>& state() const { return state_; }
  [[nodiscard]] RobotState<double>& state() {
    return state_;
  }  ///< for tests that start from a state of their own

  /// All that varies, as bytes; restore gives a robot that goes on with the same bits. Restore refuses bytes
  /// of another version, robot, length or with a wrong checksum, and then changes nothing.
  [[nodiscard]] std::string save() const;
  [[nodiscard]] bool restore(const std::string& bytes, std::string& error);

 private:
  /// One sampling of what the sensors will tell, without their errors.
  struct Sample {
    std::uint64_t number{0};  ///< rises by one with every sampling
    std::uint64_t tick{0};
    PerDrive<double> angle{};
    PerDrive<double> speed{};
    PerDrive<double> torque{};
    PerDrive<double> winding{};
    PerDrive<double> housing{};
    Vec3<double> rate{};
    Vec3<double> acceleration{};
    Vec3<double> position{};
    double voltage{0};
    double current{0};
  };
  struct Clock {
    std::uint64_t tick{0};    ///< since switched on
    std::uint64_t placed{0};  ///< tick of the last placing
    std::uint64_t draw{0};
    std::uint64_t samples{0};
    std::uint64_t asked{0};    ///< number of the newest sampling when read() was called last
    std::uint64_t told{0};     ///< number of the last frame that read() gave; 0: none since placed
    std::int64_t sent{-1};     ///< tick of the newest command; -1: none since placed
    std::int64_t acting{-1};   ///< tick of the command that the drives act on
    std::int64_t arrived{-1};  ///< tick at which it arrived
    std::uint64_t holding{0};  ///< 1: placed standing, and no command has arrived yet
    std::uint64_t lying{0};    ///< 1: placed lying
    std::uint64_t let_go{0};   ///< 1: timed out; off until a command says so
  };
  /// A command on its way, and what the answered frame said of the joints (without noise).
  struct Message {
    PerDrive<double> torque{};
    PerDrive<double> angle{};
    PerDrive<double> speed{};
    double on{0};
  };
  struct Answered {
    PerDrive<double> angle{};
    PerDrive<double> speed{};
  };
  /// Values that last as long as a fault does.
  struct Kept {
    Sample frozen;
    PerDrive<double> stuck{};
    std::uint64_t is_frozen{0};
    std::array<std::uint64_t, safety::kMaxJoints> is_stuck{};
  };

  void take_site();
  void switch_on();
  void place(const std::vector<double>& pose, std::uint64_t draw);
  void hear();
  void hold_stance();
  void tell_drives();
  [[nodiscard]] Hold<double> hold_of(std::size_t joint) const;
  void apply_faults();
  void apply_drive_fault(const Fault& fault);
  [[nodiscard]] Vec3<double> push_now() const;
  void sample();
  [[nodiscard]] const Sample& sampled(std::uint64_t lag) const;
  void add_noise(const Sample& from, safety::SensorFrame& frame) const;
  void spoil(safety::SensorFrame& frame);
  [[nodiscard]] bool faulty(v1::Fault::Kind kind) const;
  [[nodiscard]] bool acts(const Fault& fault) const;

  std::shared_ptr<const Model> model_;
  Site site_;
  std::uint64_t seed_{0};
  Stepper stepper_;
  SiteFigures<double> figures_;
  RobotState<double> state_;
  RobotWork<double> work_{};
  Told<double> told_;
  Clock clock_;
  Kept kept_;
  Answered answered_;
  Vec3<double> rate_bias_{};
  Rotation<double> imu_axes_{};
  FrameFlaws flaws_;
  std::uint64_t encoder_lag_{0};  ///< ticks
  std::uint64_t imu_lag_{0};
  Vec3<double> push_{};      ///< force of this walk's push, N
  double push_begins_s_{0};  ///< since placed
  std::size_t command_rows_{1};
  std::vector<Message> commands_;  ///< by tick modulo rows
  std::vector<std::int64_t> command_ticks_;
  std::vector<Sample> samples_;  ///< by number modulo size
};

}  // namespace pastern::stub
