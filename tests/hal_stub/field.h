// A shipped robot at sites of scenario text, stood up or walked open loop.
#pragma once

#include "tests/hal_stub/robots.h"

namespace pastern::stub {

class Field : public ::testing::Test {
 protected:
  SimulatedRobot robot(const std::string& text, std::uint64_t seed = 1) {
    return SimulatedRobot(model_, site_from(text, file_, *model_), seed);
  }
  /// Held in the stance for a while.
  SimulatedRobot stood(const std::string& text, double seconds = 2) {
    SimulatedRobot made = robot(text);
    made.place_standing(1);
    Holder(file_.robot()).run(made, seconds);
    return made;
  }
  SimulatedRobot trotted(const std::string& text, double seconds = 3) {
    SimulatedRobot made = robot(text);
    made.place_standing(1);
    Holder(file_.robot()).trot(made, seconds, 0.2, 0.06);
    return made;
  }
  /// Newest frame of a robot that was stepped once more under the stance's PD.
  safety::SensorFrame frame_of(SimulatedRobot& robot) {
    Holder holder(file_.robot());
    holder.tick(robot);
    (void)robot.read(holder.frame);
    return holder.frame;
  }

  files::RobotFile file_ = robot_file();
  std::shared_ptr<const Model> model_ = model_of(file_);
};

}  // namespace pastern::stub
