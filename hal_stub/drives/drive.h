// Drives and pack over the scalar S: torque-speed line, winding heat, rotor, gear friction, play, supply.
// Pure functions of plain values; the constants come from the robot file (C), what varies with the site is S.
#pragma once

#include <array>
#include <cmath>

#include "hal_stub/dynamics/motion.h"
#include "safety/units.h"

namespace pastern::stub {

using safety::kMaxJoints;

/// Entries of an array by drive. Wide scalars get a few more: arrays of 2 KB would meet in the same few sets
/// of the first cache.
template <class S>
inline constexpr std::size_t kDriveRoom = sizeof(S) > 16 ? kMaxJoints + 5 : kMaxJoints;

template <class S>
using PerDrive = std::array<S, kDriveRoom<S>>;

/// Copper, relative to 25 deg C, where the drive's figures hold: 1 + 0.00393 (T - 20) scaled (handbook).
template <class S>
inline S copper_ratio(const S& celsius) noexcept {
  using C = Constant<S>;
  return (C(1) + (celsius - S(C(20))) * C(0.00393)) * C(1.0 / 1.01965);
}

template <class C>
struct DriveFigures {
  C peak_torque{0};    ///< N m at the joint
  C no_load_speed{0};  ///< rad/s at nominal voltage
  C rotor_inertia{0};  ///< kg m2 at the joint
  C per_amp{0};        ///< N m/A
  C resistance{0};     ///< ohm at 25 deg C
  C winding_per_j{0};  ///< K/J
  C housing_per_j{0};
  C to_housing{0};  ///< W/K
  C to_air{0};
  C timeout_damping{0};  ///< N m s/rad, what the drive does by itself when commands stop
  // Limits beyond the line; looked at only where the site's drives are not plain:
  C most_torque{0};   ///< N m, of the peak and what the current limit lets through the lower one
  C hot{1e6};         ///< deg C: no torque any more
  C per_derating{1};  ///< 1/K, one over the span from warm to hot
};

/// Gear teeth that meet: stiff enough not to be seen, damped enough not to ring.
template <class C>
struct Teeth {
  C stiffness{C(4000)};  ///< N m/rad
  C damping{C(5)};       ///< N m s/rad
};

inline constexpr double kCoulombSpeed = 0.05;  ///< rad/s; below it Coulomb friction grows linearly

/// What a site and wear make of the drives.
template <class S>
struct DriveSite {
  PerDrive<S> strength;  ///< joint torque for unit torque that the drive believes it makes
  PerDrive<S> damping;   ///< N m s/rad
  PerDrive<S> coulomb;   ///< N m
  PerDrive<S> half_gap;  ///< rad
  S ambient;             ///< deg C
  PerDrive<S> loss{};    ///< part of the drive's torque that the gear loses against the motion
  PerDrive<S> stick{};   ///< N m, to break away beyond Coulomb; 0: no grip at rest
  /// Nothing but what stands above `loss`, no limits of drives' current and heat, none of the pack's current.
  bool plain{true};
};

template <class S>
struct DriveState {
  PerDrive<S> torque{};       ///< that the drive believes it makes, N m
  PerDrive<S> rotor_angle{};  ///< at the joint side, rad; equal to the joint's without play
  PerDrive<S> rotor_speed{};
  PerDrive<S> winding{};  ///< deg C
  PerDrive<S> housing{};
  PerDrive<S> wound{};  ///< how far a gear that sticks is drawn, -1..1 of its breaking away
};

/// Torque that the drive makes of a wanted one: the line from stall to no-load speed, moved by the supply,
/// steeper when the winding is hot. Braking is not limited by the line but by the peak.
template <class S>
inline S made_torque(const DriveFigures<Constant<S>>& drive, const S& wanted, const S& speed,
                     const S& supply_ratio, const S& winding, const S& cap) noexcept {
  using C = Constant<S>;
  const S relative = speed * (C(1) / drive.no_load_speed);
  const S warm = C(drive.peak_torque) * (C(1) / copper_ratio(winding));
  const S up = max(min((supply_ratio - relative) * warm, cap), S(0));
  const S down = max(min((supply_ratio + relative) * warm, cap), S(0));
  return select(supply_ratio > S(C(0.25)), max(min(wanted, up), S(0) - down), S(0));
}

/// Its most torque is the peak.
template <class S>
inline S made_torque(const DriveFigures<Constant<S>>& drive, const S& wanted, const S& speed,
                     const S& supply_ratio, const S& winding) noexcept {
  return made_torque(drive, wanted, speed, supply_ratio, winding, S(drive.peak_torque));
}

/// Most torque that a drive's electronics let through: that of the current limit, falling linearly to nothing
/// from the warm to the hot winding temperature (common practice of servo drives, no source).
template <class S>
inline S let_through(const DriveFigures<Constant<S>>& drive, const S& winding) noexcept {
  const S cool = (S(drive.hot) - winding) * drive.per_derating;
  return max(min(cool, S(Constant<S>(1))), S(0)) * drive.most_torque;
}

/// Gear friction as a viscosity: viscous and Coulomb, the latter regularised.
template <class S>
inline S gear_viscosity(const S& damping, const S& coulomb, const S& speed) noexcept {
  return damping + coulomb * (Constant<S>(1) / max(abs(speed), S(Constant<S>(kCoulombSpeed))));
}

// Gears that stick. Before it breaks away a gear yields like a spring that is at its end after kStickAngle:
// an elastic-plastic element (Prandtl), so that a joint at rest holds and does not creep. What it takes to
// break away fades with speed (Stribeck). The angle and speed are ours, of the size told of greased gears.
inline constexpr double kStickAngle = 0.001;  ///< rad
inline constexpr double kStickSpeed = 0.1;    ///< rad/s, half of the excess is gone
inline constexpr double kStickDamping =
    0.01;  ///< s, of the spring: damping over stiffness; no more than the friction

/// Friction of a gear in a step: torque = -push - viscosity * speed at the end of the step.
template <class S>
struct GearGrip {
  S push;
  S viscosity;
};

template <class S>
struct GearFriction {
  S damping;  ///< N m s/rad
  S sliding;  ///< N m, Coulomb and what the gear loses of the torque
  S stick;    ///< N m, beyond that to break away
};

template <class S>
inline GearGrip<S> gear_grip(const GearFriction<S>& gear, const S& speed, const S& wound,
                             Constant<S> dt) noexcept {
  using C = Constant<S>;
  const S one(C(1));
  const S fast = speed * C(1 / kStickSpeed);
  const S level = gear.sliding + gear.stick * (one / (one + fast * fast));
  const S drawn = wound + speed * (dt * C(1 / kStickAngle));
  const auto holds = abs(drawn) < one;
  const S calm = min(S(C(kStickDamping / kStickAngle)), one / max(abs(speed), S(C(1e-3))));
  const S along = level * (dt * C(1 / kStickAngle) + calm);
  const S slides = level * max(min(drawn, one), S(0) - one);
  const auto sticks = gear.stick > S(0);
  const S held = gear.damping + select(holds, along, S(0));
  return {select(sticks, select(holds, level * wound, slides), S(0)),
          select(sticks, held, gear_viscosity(gear.damping, gear.sliding, speed))};
}

/// How far it is drawn after a step that ended with `speed`.
template <class S>
inline S wound_after(const S& wound, const S& speed, Constant<S> dt) noexcept {
  using C = Constant<S>;
  const S one(C(1));
  return max(min(wound + speed * (dt * C(1 / kStickAngle)), one), S(0) - one);
}

/// What couples a rotor to its joint in a step; kept to move the rotor afterwards.
template <class S>
struct Coupling {
  S rotor_force;    ///< right-hand side of the rotor
  S rotor_inverse;  ///< 1 / its matrix
  S mesh;           ///< dt * viscosity of the teeth, zero in the gap
};

/// A joint and its rotor at the begin of a step.
template <class S>
struct GearedJoint {
  S torque;     ///< that acts on the rotor, N m
  S viscosity;  ///< of the gear, N m s/rad
  S half_gap;   ///< rad
  S angle;
  S speed;
  S rotor_angle;
  S rotor_speed;
};

/// Rotor, friction and teeth of one joint, the rotor eliminated from the step: without a gap it sits on the
/// joint.
template <class S>
inline JointLoad<S> load_of(const DriveFigures<Constant<S>>& drive, const Teeth<Constant<S>>& teeth,
                            const GearedJoint<S>& j, Constant<S> dt, Coupling<S>& coupling) noexcept {
  using C = Constant<S>;
  const S zero(0);
  const auto loose = j.half_gap > zero;
  const S ahead = j.rotor_angle - j.angle;
  const S bite = max(ahead - j.half_gap, zero) + min(ahead + j.half_gap, zero);
  const S meeting = select(abs(bite) > zero, S(teeth.stiffness * dt + teeth.damping), zero);
  const S through = bite * C(teeth.stiffness) + (j.rotor_speed - j.speed) * meeting;
  const S mesh = meeting * dt;
  const S inverse = C(1) / (C(drive.rotor_inertia) + mesh + j.viscosity * dt + S(C(1e-9)));
  const S rotor_force = j.torque - j.viscosity * j.rotor_speed - through;
  coupling = {rotor_force, inverse, mesh};
  const S rigid_torque = j.torque - j.viscosity * j.speed;
  const S rigid_inertia = C(drive.rotor_inertia) + j.viscosity * dt;
  return {select(loose, through + mesh * inverse * rotor_force, rigid_torque),
          select(loose, mesh - mesh * mesh * inverse, rigid_inertia)};
}

/// Two nodes, winding and housing (first order each), explicit step; `loss` in W.
template <class S>
inline void heat(const DriveFigures<Constant<S>>& drive, const S& loss, const S& ambient, Constant<S> dt,
                 S& winding, S& housing) noexcept {
  const S inward = (winding - housing) * drive.to_housing;
  const S outward = (housing - ambient) * drive.to_air;
  winding = winding + (loss - inward) * (drive.winding_per_j * dt);
  housing = housing + (inward - outward) * (drive.housing_per_j * dt);
}

template <class C>
struct PackFigures {
  C nominal{0};         ///< V
  C capacity_as{0};     ///< A s
  C resistance{0};      ///< ohm
  C idle{0};            ///< W
  C most_current{1e9};  ///< A, drives are held back beyond
};

template <class S>
struct PackSite {
  S open_scale;  ///< V for unit relative cell voltage
  S resistance;  ///< ohm
};

template <class S>
struct PackState {
  S charge{};   ///< 0..1
  S voltage{};  ///< V at the terminals
  S current{};  ///< A, positive out of the pack
  S share{1};   ///< of the wanted torque that the pack's current limit leaves to every drive
};

/// Relative open-circuit voltage over charge above 5 %: the polynomial of a lithium-ion cell (Chen and
/// Rincon-Mora, IEEE Trans. Energy Conv. 21(2) 2006) over its value at 60 %, with the exponential knee as a
/// rational function.
template <class S>
inline S open_voltage(const S& charge) noexcept {
  using C = Constant<S>;
  const S s = max(charge, S(0));
  // exp(-35 s) by (1 + 35 s/8)^-8
  S k = C(1) / (s * C(35.0 / 8) + C(1));
  k = k * k;
  k = k * k;
  k = k * k;
  const S volts = C(3.685) + s * (C(0.2156) - s * (C(0.1178) - s * C(0.3201))) - k * C(1.031);
  return volts * C(1.0 / 3.8411);
}

/// Terminals under `power` W for a step: V = E - I R with V I = power; more power than the pack can give is
/// not given.
template <class S>
inline void draw(const PackFigures<Constant<S>>& pack, const PackSite<S>& site, const S& power,
                 Constant<S> dt, PackState<S>& state) noexcept {
  using C = Constant<S>;
  const S open = open_voltage(state.charge) * site.open_scale;
  const S root = sqrt(max(open * open - site.resistance * power * C(4), S(0)));
  state.current = (open - root) * (C(0.5) / site.resistance);
  state.voltage = open - state.current * site.resistance;
  state.charge = max(min(state.charge - state.current * (dt / pack.capacity_as), S(C(1))), S(0));
}

inline constexpr double kHoldBackSeconds = 0.005;  ///< of a pack's current limiter; ours

/// The pack's current limit: all drives give the same lower share of what they are told until the current is
/// within it (common practice, no source).
template <class S>
inline void hold_back(const PackFigures<Constant<S>>& pack, Constant<S> dt, PackState<S>& state) noexcept {
  using C = Constant<S>;
  const S current = max(state.current, S(C(1e-3)));
  const S wanted = min(state.share * pack.most_current * (S(C(1)) / current), S(C(1)));
  state.share = state.share + (wanted - state.share) * (dt * (C(1) / (dt + C(kHoldBackSeconds))));
}

/// Resistance of a pack at `celsius` over that at 25 deg C: a straight line of its logarithm through `ratio`
/// at -20 deg C (3 to 5 is told of lithium-ion cells; weak source), not below 1.
inline double cold_resistance(double ratio, double celsius) noexcept {
  return ratio > 1 && celsius < 25 ? std::pow(ratio, (25 - celsius) / 45) : 1;
}

}  // namespace pastern::stub
