// A robot's step in double, fitted to its shape and to the machine: four legs of one kind side by side where
// the robot has them, compiled for the plain machine and for one with AVX2 and fused multiply-add, chosen at
// run time. On one machine always the same: same calls, same bits.
#pragma once

#include <memory>

#include "hal_stub/robot/robot_state.h"

namespace pastern::stub {

class Stepper {
 public:
  /// `figures` must outlive it. Allocates here and nowhere else.
  explicit Stepper(const Figures<double>& figures);
  ~Stepper();
  Stepper(Stepper&& other) noexcept;
  Stepper& operator=(Stepper&& other) noexcept;
  Stepper(const Stepper&) = delete;
  Stepper& operator=(const Stepper&) = delete;

  /// Before the first step and whenever trunk, ground, drives or pack of the site have changed.
  void take_site(const SiteFigures<double>& site) noexcept;
  /// step_robot. `site` as taken, but for the push, which may be another in each step.
  void step(const SiteFigures<double>& site, const Told<double>& told, double dt, RobotState<double>& state,
            RobotWork<double>& work) noexcept;

 private:
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

/// step_robot without any of that, the same on every machine; for comparison.
void step_plainly(const Figures<double>& figures, const SiteFigures<double>& site, const Told<double>& told,
                  double dt, RobotState<double>& state, RobotWork<double>& work) noexcept;

}  // namespace pastern::stub
