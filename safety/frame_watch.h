// Is the sensor frame fit to be judged: finite, physically possible, new, alive, without jumps?
// Limits of "possible" are wide: what no working sensor says. The robot's own limits are watched elsewhere.
#pragma once

#include <array>
#include <cstdint>

#include "safety/findings.h"
#include "safety/frames.h"
#include "safety/limits.h"

namespace pastern::safety {

/// A measured torque, speed or current of more than so many times its limit is no measurement.
inline constexpr double kImpossibleFactor = 10.0;
/// As is an angle this far outside the joint's range (a full turn), or a temperature outside these.
inline constexpr double kImpossibleAngle = 6.283185307179586;
inline constexpr double kColdestC = -90.0;
inline constexpr double kHottestC = 500.0;
inline constexpr double kMostPackV = 1e4;
inline constexpr double kMostPositionM = 1e6;

/// A joint is stuck when its angle has stood still, to the bit, for frame_frozen_ticks frames and by its own
/// measured speed it has then moved by more than this share of frame_jump_rad ...
inline constexpr double kStuckShare = 0.2;
/// ... within so many times frame_frozen_ticks: slower than that it is believed to stand, whatever its speed
/// sensor's offset.
inline constexpr int kStuckSpan = 25;

/// What a working sensor of a joint may say; of speed and torque, either way.
struct JointRanges {
  double angle_low{0};
  double angle_high{0};
  double speed{0};
  double torque{0};
};

class FrameWatch {
 public:
  explicit FrameWatch(const Limits& limits) noexcept;

  /// `live`: torque is on or about to be, so jumps and stuck joints count (limbs of a parked robot may be
  /// moved by hand).
  /// Until the first fresh frame a robot that is not live has nothing to judge.
  void look(const Limits& limits, const SensorFrame& frame, bool frame_new, bool live, std::int64_t elapsed,
            Findings& found) noexcept;
  /// Forgets the last frame, its age and how long it was frozen.
  void reset() noexcept;

  /// There has been a fresh frame since the start or the last reset.
  [[nodiscard]] bool seen() const noexcept { return seen_; }
  /// The frame is a new one: its counter has risen.
  [[nodiscard]] bool fresh() const noexcept { return fresh_; }
  /// Ticks between the last two fresh frames.
  [[nodiscard]] std::int64_t gap() const noexcept { return gap_; }
  /// Joint speeds may be used to damp: finite, possible, not stale, not frozen.
  [[nodiscard]] bool speeds_usable() const noexcept { return speeds_usable_; }

 private:
  void look_for_age(const Limits& limits, const SensorFrame& frame, bool frame_new, std::int64_t elapsed,
                    Findings& found) noexcept;
  void look_for_life(const Limits& limits, const SensorFrame& frame, Findings& found) noexcept;
  /// From frame to frame, every joint on its own: too far, or not at all though it moves.
  void look_at_steps(const Limits& limits, const SensorFrame& frame, Findings& found) noexcept;
  void look_at_still_joint(const Limits& limits, double speed, int joint, Findings& found) noexcept;
  [[nodiscard]] bool all_possible(const SensorFrame& frame, int joint_count) const noexcept;
  void remember(const SensorFrame& frame, int joint_count) noexcept;

  std::int64_t stale_ticks_;
  double tick_s_;
  double stuck_rad_;
  std::array<JointRanges, kMaxJoints> ranges_{};
  bool ranges_finite_{true};
  std::array<int, kMaxJoints> still_{};     ///< frames since the angle last changed; while torque is on
  std::array<double, kMaxJoints> crept_{};  ///< way by measured speed since then, after the first frames; rad
  SensorFrame last_;
  bool seen_{false};
  bool fresh_{false};
  bool speeds_usable_{false};
  std::int64_t age_{0};
  std::int64_t gap_{1};
  int frozen_{0};
};

/// min(max(joint_count, 0), kMaxJoints).
[[nodiscard]] constexpr int joints_of(const Limits& limits) noexcept {
  if (limits.joint_count < 0) return 0;
  return limits.joint_count > kMaxJoints ? kMaxJoints : limits.joint_count;
}

}  // namespace pastern::safety
