// Everything that step_robot calls is inlined into each of the two (flatten), so that no wide code leaks into
// the plain path through shared inline functions.
#include "hal_stub/robot/advance.h"

namespace pastern::stub {

__attribute__((flatten)) void advance_plain(const Figures<double>& figures, const SiteFigures<double>& site,
                                            const Told<double>& told, double dt, RobotState<double>& state,
                                            RobotWork<double>& work) noexcept {
  step_robot(figures, site, told, dt, state, work);
}

namespace {

#if defined(__x86_64__)
__attribute__((flatten, target("avx2,fma"))) void advance_wide(const Figures<double>& figures,
                                                               const SiteFigures<double>& site,
                                                               const Told<double>& told, double dt,
                                                               RobotState<double>& state,
                                                               RobotWork<double>& work) noexcept {
  step_robot(figures, site, told, dt, state, work);
}
bool is_wide() noexcept { return __builtin_cpu_supports("avx2") != 0 && __builtin_cpu_supports("fma") != 0; }
#else
constexpr auto advance_wide = advance_plain;
bool is_wide() noexcept { return false; }
#endif

const bool kWide = is_wide();

}  // namespace

void advance(const Figures<double>& figures, const SiteFigures<double>& site, const Told<double>& told,
             double dt, RobotState<double>& state, RobotWork<double>& work) noexcept {
  if (kWide) {
    advance_wide(figures, site, told, dt, state, work);
  } else {
    advance_plain(figures, site, told, dt, state, work);
  }
}

}  // namespace pastern::stub
