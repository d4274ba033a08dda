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

  /// Start of a walk: yaw, position and speed are zero here. Cold: everything learned before is forgotten,
  /// the gyro's bias too, and roll and pitch come from gravity in `frame`; what follows is then a function of
  /// the frames alone.
  void begin(const safety::SensorFrame& frame, bool cold) noexcept;
  /// Every tick with a fresh frame. `dt_s` is the nominal period; frames missed by the counter are bridged. A
  /// frame with a value that is not finite leaves the estimate as it was.
  const BodyEstimate<>& update(const safety::SensorFrame& frame, double dt_s) noexcept;
  [[nodiscard]] const BodyEstimate<>& body() const noexcept;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace pastern::estimate
