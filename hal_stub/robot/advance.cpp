// Everything that a step calls is inlined into each of its forms (flatten), so that no wide code leaks into
// the plain path through shared inline functions.
#include "hal_stub/robot/advance.h"

// Quads are never passed between functions that are really called, so their calling convention does not
// matter.
#pragma GCC diagnostic ignored "-Wpsabi"
#include "hal_stub/robot/four_legs.h"

// Under a sanitizer nothing is flattened, so nothing may be wide either.
#if defined(__x86_64__) && !defined(__SANITIZE_ADDRESS__) && !defined(__SANITIZE_THREAD__)
#define PASTERN_WIDE PASTERN_FLATTEN __attribute__((target("avx2,fma")))
#else
#define PASTERN_WIDE PASTERN_FLATTEN
#endif

namespace pastern::stub {

struct Stepper::Impl {
  explicit Impl(const Figures<double>& of) : robot(of) {}
  FourLegged robot;
  using Step = void (*)(Impl&, const SiteFigures<double>&, const Told<double>&, double, RobotState<double>&,
                        RobotWork<double>&) noexcept;
  Step step{nullptr};
  Step on_plain{nullptr};  ///< sites; the fast form of nearly all
  Step on_any{nullptr};

  template <int K, bool kPlain>
  PASTERN_FLATTEN static void four_plain(Impl& impl, const SiteFigures<double>& site,
                                         const Told<double>& told, double dt, RobotState<double>& state,
                                         RobotWork<double>& work) noexcept {
    step_four<K, kPlain>(impl.robot, site, told, dt, state, work);
  }
  template <int K, bool kPlain>
  PASTERN_WIDE static void four_wide(Impl& impl, const SiteFigures<double>& site, const Told<double>& told,
                                     double dt, RobotState<double>& state, RobotWork<double>& work) noexcept {
    step_four<K, kPlain>(impl.robot, site, told, dt, state, work);
  }
  PASTERN_FLATTEN static void any_plain(Impl& impl, const SiteFigures<double>& site, const Told<double>& told,
                                        double dt, RobotState<double>& state,
                                        RobotWork<double>& work) noexcept {
    step_robot(impl.robot.figures, site, told, dt, state, work);
  }
  PASTERN_WIDE static void any_wide(Impl& impl, const SiteFigures<double>& site, const Told<double>& told,
                                    double dt, RobotState<double>& state, RobotWork<double>& work) noexcept {
    step_robot(impl.robot.figures, site, told, dt, state, work);
  }
};

namespace {

bool is_wide() noexcept {
#if defined(__x86_64__)
  return __builtin_cpu_supports("avx2") != 0 && __builtin_cpu_supports("fma") != 0;
#else
  return false;
#endif
}

}  // namespace

Stepper::Stepper(const Figures<double>& figures) : impl_(std::make_unique<Impl>(figures)) {
  const bool wide = is_wide();
  impl_->step = impl_->on_plain = impl_->on_any = wide ? Impl::any_wide : Impl::any_plain;
  if (!is_four_alike(figures.tree)) return;
  pack_figures(figures, impl_->robot.four);
  for_chain(figures.tree.leg[0].joint_count, [&]<int K>() {
    impl_->step = impl_->on_plain = wide ? Impl::four_wide<K, true> : Impl::four_plain<K, true>;
    impl_->on_any = wide ? Impl::four_wide<K, false> : Impl::four_plain<K, false>;
  });
}

Stepper::~Stepper() = default;
Stepper::Stepper(Stepper&& other) noexcept = default;
Stepper& Stepper::operator=(Stepper&& other) noexcept = default;

void Stepper::take_site(const SiteFigures<double>& site) noexcept {
  if (is_four_alike(impl_->robot.figures.tree)) pack_site(site, impl_->robot.four);
  impl_->step = is_plain(site) ? impl_->on_plain : impl_->on_any;
}

void Stepper::step(const SiteFigures<double>& site, const Told<double>& told, double dt,
                   RobotState<double>& state, RobotWork<double>& work) noexcept {
  impl_->step(*impl_, site, told, dt, state, work);
}

void step_plainly(const Figures<double>& figures, const SiteFigures<double>& site, const Told<double>& told,
                  double dt, RobotState<double>& state, RobotWork<double>& work) noexcept {
  step_robot(figures, site, told, dt, state, work);
}

}  // namespace pastern::stub
