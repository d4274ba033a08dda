// A cycle round the looped plug-in, as benches use it: a shipped robot file, a policy of a fixed shape, no
// simulation.
#pragma once

#include <memory>
#include <string>

#include "proto/files/robot_file.h"
#include "runtime/session/cycle.h"
#include "tests/bench/rig/looped_hal.h"

namespace pastern::bench {

/// Reads hal_stub/robots/NAME.robot.txtpb; ends the program with a line when it is not sound.
[[nodiscard]] files::RobotFile shipped_robot(const std::string& name);

/// Inputs one, roll, pitch, three rates, joint offsets, phase; 32 tanh units; all actions of all legs;
/// double. Small fixed weights: the robot in the loop cannot fall anyway. The heaviest kind that is meant to
/// be shipped.
[[nodiscard]] v1::Policy policy_of_fixed_shape(const v1::Robot& robot);

/// Options of the looped plug-in for this robot.
[[nodiscard]] std::string looped_options(const v1::Robot& robot);
/// Path of the looped plug-in.
[[nodiscard]] std::string looped_plugin();

/// `stalls_pass`: a host that stalls the thread does not trip the gate (no tick counts as late); for what
/// does not depend on time.
[[nodiscard]] std::unique_ptr<session::Cycle> cycle_in_loop(const files::RobotFile& robot, session::Pace pace,
                                                            bool stalls_pass = false);

/// The plug-in's times of the last tick.
[[nodiscard]] const looped_times& plugin_times();

/// Called by the plug-in in the cycle's thread at each read; null for none. Only while the cycle does not
/// tick.
void set_plugin_hook(looped_hook hook);

}  // namespace pastern::bench
