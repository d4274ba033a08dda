// Everything that varies in a simulated robot, over the scalar S, and one step of it: drives, body, heat,
// pack. Plain numbers only, so that it can be saved as bytes.
#pragma once

#include <cstdint>

#include "hal_stub/drives/drive.h"
#include "hal_stub/dynamics/step.h"

namespace pastern::stub {

template <class S>
struct RobotState {
  BodyState<S> body;
  DriveState<S> drives;
  PackState<S> pack;
};

/// Constant figures of a robot in C.
template <class C>
struct Figures {
  Tree<C> tree;
  std::array<DriveFigures<C>, kMaxJoints> drive{};
  /// Of gears of hinges, and of those of joints that slide (N/m, N s/m).
  std::array<Teeth<C>, 2> teeth{Teeth<C>{}, Teeth<C>{C(400000), C(500)}};
  PackFigures<C> pack;
};

/// What a site makes of it.
template <class S>
struct SiteFigures {
  Surroundings<S> around;
  DriveSite<S> drives{};
  PackSite<S> pack{};
};

/// Drives are plain, links as heavy as their figures, and nothing hangs.
template <class S>
inline bool as_made(const SiteFigures<S>& site) noexcept {
  return site.drives.plain && !site.around.trunk.weighed && !site.around.hangs;
}

/// What the drives are told in a step; `wanted` by joint order. The drive acts on the wanted torque times
/// `on`, minus the damping that it does by itself times `damping`; a forced torque is one that ignores
/// commands (a fault).
template <class S>
struct Told {
  PerDrive<S> wanted{};
  PerDrive<S> forced{};  ///< added by a runaway drive, N m
  S on{1};               ///< 0 or 1
  S damping{0};          ///< 0 or 1
};

template <class S>
struct RobotWork {
  Work<S> body;
  Loads<S> loads;
  PerDrive<Coupling<S>> coupling;
  S power;       ///< electrical, W
  S mechanical;  ///< sum of |torque * joint speed|, W
};

/// Drives and gears of all joints. kPlain: the site's drives are plain.
template <bool kPlain, class S>
inline void drive_joints(const Figures<Constant<S>>& figures, const SiteFigures<S>& site, const Told<S>& told,
                         Constant<S> dt, RobotState<S>& state, RobotWork<S>& work) noexcept {
  using C = Constant<S>;
  const S supply = state.pack.voltage * (C(1) / figures.pack.nominal);
  work.power = S(figures.pack.idle);
  work.mechanical = S(0);
  for (int l = 0; l < figures.tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    const auto& leg = figures.tree.leg[n];
    for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
      const auto k = static_cast<std::size_t>(leg.joint[i].order);
      const auto& drive = figures.drive[k];
      DriveState<S>& d = state.drives;
      const S speed = state.body.speed[n][i];
      const S rotor_speed = select(site.drives.half_gap[k] > S(0), d.rotor_speed[k], speed);
      const S wanted =
          told.wanted[k] * told.on + told.forced[k] - rotor_speed * told.damping * drive.timeout_damping;
      const S torque = [&] {
        if constexpr (kPlain) {
          return made_torque(drive, wanted, rotor_speed, supply, d.winding[k]);
        } else {
          return made_torque(drive, S(wanted * state.pack.share), rotor_speed, supply, d.winding[k],
                             let_through(drive, d.winding[k]));
        }
      }();
      const S real = torque * site.drives.strength[k];
      const S amps = torque * (C(1) / drive.per_amp);
      const S loss = amps * amps * drive.resistance * copper_ratio(d.winding[k]);
      const GearGrip<S> grip = [&]() -> GearGrip<S> {
        const auto& at = site.drives;
        if constexpr (kPlain) {
          return {S(0), gear_viscosity(at.damping[k], at.coulomb[k], rotor_speed)};
        } else {
          const GearFriction<S> gear{at.damping[k], at.coulomb[k] + at.loss[k] * abs(real), at.stick[k]};
          return gear_grip(gear, rotor_speed, d.wound[k], dt);
        }
      }();
      const S acting = [&] {
        if constexpr (kPlain) return real;
        return S(real - grip.push);
      }();
      const GearedJoint<S> geared{
          acting,           grip.viscosity, site.drives.half_gap[k], state.body.angle[n][i], speed,
          d.rotor_angle[k], rotor_speed};
      const auto& teeth = figures.teeth[static_cast<std::size_t>(leg.joint[i].slides)];
      work.loads[n][i] = load_of(drive, teeth, geared, dt, work.coupling[k]);
      work.power = work.power + real * rotor_speed + loss;
      work.mechanical = work.mechanical + abs(torque * speed);
      heat(drive, loss, site.drives.ambient, dt, d.winding[k], d.housing[k]);
      d.torque[k] = torque;
    }
  }
}

template <bool kPlain, class S>
inline void move_rotors(const Figures<Constant<S>>& figures, const SiteFigures<S>& site, Constant<S> dt,
                        const std::array<PerChain<S>, kMaxTreeLegs>& speed_before, RobotState<S>& state,
                        const RobotWork<S>& work) noexcept {
  for (int l = 0; l < figures.tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    const auto& leg = figures.tree.leg[n];
    for (std::size_t i = 0; i < static_cast<std::size_t>(leg.joint_count); ++i) {
      const auto k = static_cast<std::size_t>(leg.joint[i].order);
      DriveState<S>& d = state.drives;
      const Coupling<S>& c = work.coupling[k];
      const S gain = state.body.speed[n][i] - speed_before[n][i];  // dt * joint acceleration
      const S speed = d.rotor_speed[k] + (c.rotor_force * dt + c.mesh * gain) * c.rotor_inverse;
      const auto loose = site.drives.half_gap[k] > S(0);
      d.rotor_speed[k] = select(loose, speed, state.body.speed[n][i]);
      d.rotor_angle[k] = select(loose, d.rotor_angle[k] + speed * dt, state.body.angle[n][i]);
      if constexpr (!kPlain) d.wound[k] = wound_after(d.wound[k], d.rotor_speed[k], dt);
    }
  }
}

/// One step of everything that moves, warms or runs down. kMade: known to be as_made().
template <bool kMade = false, class S>
inline void step_robot(const Figures<Constant<S>>& figures, const SiteFigures<S>& site, const Told<S>& told,
                       Constant<S> dt, RobotState<S>& state, RobotWork<S>& work) noexcept {
  const bool plain = kMade || site.drives.plain;
  if (plain) {
    drive_joints<true>(figures, site, told, dt, state, work);
  } else {
    drive_joints<false>(figures, site, told, dt, state, work);
  }
  const auto speed_before = state.body.speed;
  step_body<kMade>(figures.tree, site.around, work.loads, dt, state.body, work.body);
  if (plain) {
    move_rotors<true>(figures, site, dt, speed_before, state, work);
  } else {
    move_rotors<false>(figures, site, dt, speed_before, state, work);
  }
  draw(figures.pack, site.pack, work.power, dt, state.pack);
  if (!plain) hold_back(figures.pack, dt, state.pack);
}

}  // namespace pastern::stub
