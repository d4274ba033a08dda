// Between the plug-in's C frame and command and the simulated robot's types.
#pragma once

#include "hal_stub/robot/simulated_robot.h"
#include "runtime/hal/pastern_hal.h"

namespace pastern::stub {

/// The caller's struct_size stays.
void fill_frame(const safety::SensorFrame& from, pastern_hal_frame& to) noexcept;
[[nodiscard]] safety::Torques<> torques_of(const pastern_hal_command& command) noexcept;

}  // namespace pastern::stub
