// A start point made of nothing but the robot file: an open-loop trot as a linear policy.
#pragma once

#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"

namespace pastern::tools {

/// Linear policy, 50 Hz, inputs 1, roll, pitch, rates of roll, pitch and yaw, joint offsets, sine and cosine
/// of the phase; outputs leg angle, leg length (and abduction) a leg. Leg angle goes as the sine and leg
/// length as the minus cosine of the phase, so that a leg is short while it swings forward; legs diagonally
/// opposite go together (by the signs of their hips' places), the other pair half a turn later. `robot` is a
/// checked one.
[[nodiscard]] v1::Policy open_loop_trot(const v1::Robot& robot);

}  // namespace pastern::tools
