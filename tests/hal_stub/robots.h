// Simulated robots for the tests: made from the shipped files, stood up, held, walked open loop.
#pragma once

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <memory>
#include <string>

#include "hal_stub/robot/simulated_robot.h"
#include "proto/files/robot_file.h"
#include "proto/files/scenario_file.h"

namespace pastern::stub {

inline files::RobotFile robot_file(const std::string& name = "dunlin12") {
  files::Defects defects;
  auto file = files::read_robot(PASTERN_SOURCE_DIR "/hal_stub/robots/" + name + ".robot.txtpb", defects);
  EXPECT_TRUE(file) << files::lines(defects);
  return *file;
}

inline std::shared_ptr<const Model> model_of(const files::RobotFile& file) {
  std::string error;
  auto model = Model::make(file.robot(), error);
  EXPECT_NE(model, nullptr) << error;
  return model;
}

/// A site of scenario text; checked as a file would be.
inline Site site_from(const std::string& text, const files::RobotFile& file, const Model& model) {
  files::Defects defects;
  const auto scenario = files::parse_scenario("name: \"test\"\n" + text, "test", file, defects);
  EXPECT_TRUE(scenario) << files::lines(defects);
  return scenario ? site_of(*scenario, model, 1) : nominal_site(model);
}

/// PD with the robot file's gains, as the cycle would.
class Holder {
 public:
  explicit Holder(const v1::Robot& robot) : robot_(robot) {
    for (int j = 0; j < robot.joints_size(); ++j) target[j] = robot.joints(j).stance_rad();
  }
  void tick(SimulatedRobot& robot) {
    (void)robot.read(frame);
    safety::Torques<> torque;
    for (int j = 0; j < robot_.joints_size(); ++j) {
      const auto& joint = robot_.joints(j);
      const double peak = joint.guard().peak_torque_nm();
      torque[j] = std::clamp(joint.stiffness_nm_per_rad() * (target[j] - frame.angle[j]) -
                                 joint.damping_nm_s_per_rad() * frame.speed[j],
                             -peak, peak);
    }
    robot.command(torque, true);
    robot.step();
  }
  void run(SimulatedRobot& robot, double seconds) {
    const auto ticks = std::lround(seconds / robot.model().period_s());
    for (long k = 0; k < ticks; ++k) tick(robot);
  }
  /// Open-loop trot: leg angle as the sine, leg length as the cosine of the phase.
  void trot(SimulatedRobot& robot, double seconds, double amplitude, double lift) {
    const auto ticks = std::lround(seconds / robot.model().period_s());
    for (long k = 0; k < ticks; ++k) {
      const double t = static_cast<double>(k) * robot.model().period_s();
      const double grown = std::min(1.0, t / 0.4);
      for (int l = 0; l < robot_.legs_size(); ++l) {
        const double shift = l == 0 || l == 3 ? 0 : 3.14159265358979;
        const double phase = 2 * 3.14159265358979 * 2.5 * t + shift;
        aim(l, -amplitude * grown * std::sin(phase), -lift * grown * std::max(0.0, std::cos(phase)));
      }
      tick(robot);
    }
  }

  safety::JointAngles<> target;
  safety::SensorFrame frame;

 private:
  int index(const std::string& name) const {
    for (int j = 0; j < robot_.joints_size(); ++j) {
      if (robot_.joints(j).name() == name) return j;
    }
    return -1;
  }
  void aim(int l, double angle, double length) {
    const auto& leg = robot_.legs(l);
    const int hip = index(leg.hip());
    const int knee = index(leg.knee());
    const double a = -robot_.joints(knee).origin_m().z();
    const double b = -leg.foot_m().z();
    const double stance_knee = robot_.joints(knee).stance_rad();
    const double full = std::sqrt(a * a + b * b + 2 * a * b * std::cos(stance_knee)) + length;
    const double bend = -std::acos((full * full - a * a - b * b) / (2 * a * b));
    const double lean = std::atan2(b * std::sin(stance_knee), a + b * std::cos(stance_knee));
    target[hip] = robot_.joints(hip).stance_rad() + lean + angle -
                  std::atan2(b * std::sin(bend), a + b * std::cos(bend));
    target[knee] = bend;
  }

  const v1::Robot& robot_;
};

}  // namespace pastern::stub
