// step_robot for double, compiled for the plain machine and for one with AVX2 and fused multiply-add; chosen
// at run time. On one machine always the same one: same calls, same bits.
#pragma once

#include "hal_stub/robot/robot_state.h"

namespace pastern::stub {

void advance(const Figures<double>& figures, const SiteFigures<double>& site, const Told<double>& told,
             double dt, RobotState<double>& state, RobotWork<double>& work) noexcept;
/// The same on every machine, slower; for comparison.
void advance_plain(const Figures<double>& figures, const SiteFigures<double>& site, const Told<double>& told,
                   double dt, RobotState<double>& state, RobotWork<double>& work) noexcept;

}  // namespace pastern::stub
