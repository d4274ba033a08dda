// SensorFrame -> BodyEstimate: attitude (explicit complementary filter, Mahony, Hamel, Pflimlin, IEEE TAC
// 53(5) 2008, or the IMU's own), leg odometry from stance legs, or an external position source. Cycle thread;
// no heap after construction.
#pragma once

#include <memory>

#include "pastern/v1/robot.pb.h"
#include "runtime/types/body.h"
#include "safety/frames.h"

namespace pastern::estimate {

class Estimator {
 public:
  explicit Estimator(const v1::Robot& robot);  // a checked robot
  ~Estimator();

  /// Start of a walk: yaw, position and speed are zero here; roll and pitch from gravity in `frame` if
  /// `cold`.
  void begin(const safety::SensorFrame& frame, bool cold) noexcept;
  /// Every tick with a fresh frame. `dt_s` is the nominal period.
  const BodyEstimate<>& update(const safety::SensorFrame& frame, double dt_s) noexcept;
  [[nodiscard]] const BodyEstimate<>& body() const noexcept;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace pastern::estimate
