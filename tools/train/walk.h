// One walk in process: the simulated robot's own sensors and drives, the same policy, PD, torque clamps and
// return as on the robot, without the gate's latches, estimator or session. It begins as a walk of a session
// does: lying on the mark, rise, stand. Attitude is the true one with an error that stays for the walk.
#pragma once

#include <functional>
#include <memory>

#include "hal_stub/robot/simulated_robot.h"
#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "tools/packed/walk.h"
#include "tools/train/trials.h"

namespace pastern::tools {

/// The site of a lot.
using SiteChoice = std::function<stub::Site(const stub::Model& model, const Lot& lot)>;

/// Everything constant that walks of one robot and one policy layout share; read by all threads.
class WalkSetting {
 public:
  /// Both checked (proto/files). Null with a line in `error` when the simulated robot cannot be this robot.
  [[nodiscard]] static std::shared_ptr<const WalkSetting> make(const v1::Robot& robot,
                                                               const v1::Policy& policy, double walk_s,
                                                               std::string& error,
                                                               double longest_step_s = 0.001);
  ~WalkSetting();
  [[nodiscard]] const stub::Model& model() const;
  /// The same for walks by lanes.
  [[nodiscard]] const std::shared_ptr<const packed::WalkSettings>& for_lanes() const;

 private:
  friend class WalkCourse;
  WalkSetting();
  struct Parts;
  std::unique_ptr<Parts> parts_;
};

/// A walk ends at once when the robot falls (body axis more than 34 degrees from vertical, base under half
/// its stance height, a part other than a foot on the ground): nothing is earned after it, and the fall term
/// is taken.
class WalkCourse final : public Course {
 public:
  WalkCourse(std::shared_ptr<const WalkSetting> setting, SiteChoice choose);
  ~WalkCourse() override;
  [[nodiscard]] Score run(const Parameters& parameters, const Lot& lot) override;
  [[nodiscard]] std::unique_ptr<Course> another() const override;
  [[nodiscard]] double duration_s() const override;
  /// The same walks by lanes (packed_trials.h).
  [[nodiscard]] std::unique_ptr<Trials> by_lanes(unsigned threads) const;
  /// Called after each tick of the walk with its time, and once before the first; empty: nobody looks.
  using Watch = std::function<void(const stub::SimulatedRobot& robot, double time_s)>;
  void watch(Watch watch) { watch_ = std::move(watch); }

 private:
  struct Work;
  std::shared_ptr<const WalkSetting> setting_;
  SiteChoice choose_;
  Watch watch_;
  std::unique_ptr<Work> work_;
};

/// All chance of a lot's walk but its site.
struct WalkChance {
  std::uint64_t seed{0};  ///< of the simulated robot
  std::uint64_t draw{0};
  double roll_error_rad{0};  ///< of the estimated attitude
  double pitch_error_rad{0};
};
[[nodiscard]] WalkChance chance_of(const Lot& lot) noexcept;

/// Sites drawn anew for each lot.
struct SiteRanges;
[[nodiscard]] SiteChoice drawn_sites(const SiteRanges& ranges);
/// The same site for every lot.
[[nodiscard]] SiteChoice one_site(const stub::Site& site);

}  // namespace pastern::tools
