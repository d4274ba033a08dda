// A site: what is true of a robot and a place on one day. Plain figures; a scenario file, or a draw of
// training, fills it in. No heap.
#pragma once

#include <array>
#include <cstdint>

#include "pastern/v1/scenario.pb.h"
#include "safety/units.h"

namespace pastern::stub {

class Model;

inline constexpr int kMaxFaults = 32;

/// A fault with its times in seconds since the simulated robot was switched on.
struct Fault {
  v1::Fault::Kind kind{v1::Fault::KIND_NOT_SAID};
  int joint{-1};  ///< -1: every joint, or not a joint's
  double begins_s{0};
  double ends_s{0};
  double size{0};
};

inline constexpr int kMaxGroundSteps = 16;
inline constexpr int kMaxGroundPatches = 8;

struct GroundStep {
  double at_m{0};  ///< along the lane, where it begins to rise
  double height_m{0};
};

struct GroundPatch {
  double from_m{0};
  double to_m{0};
  double right_m{0};
  double left_m{0};
  double friction{0};
};

/// What stands on the slope, and how a point slides on it. As made: a plane and plain Coulomb friction.
struct GroundShape {
  double wave_height_m{0};  ///< crest to trough
  double wave_length_m{1};
  int step_count{0};
  std::array<GroundStep, kMaxGroundSteps> step{};
  int patch_count{0};
  std::array<GroundPatch, kMaxGroundPatches> patch{};
  double stick_ratio{1};             ///< friction at rest over that of sliding
  double friction_fall{0};           ///< part of the friction lost by 0.3 m/s of sliding
  double stick_speed_m_per_s{0.02};  ///< sticks below
  double damping_rise_s_per_m{0};    ///< damping += stiffness * this * depth
};

struct Site {
  double load_kg{0};
  std::array<double, 3> load_at_m{};  ///< trunk frame
  double load_hangs_m{0};             ///< below that place, when at rest; 0: the load is fixed
  double load_swing_damping{0.02};    ///< of critical; ours, of a strap in air
  double pack_voltage_ratio{1};       ///< of nominal, at rest, at the start
  double pack_resistance_ratio{1};
  double friction{0.8};
  double slope_rad{0};  ///< positive: upward along the lane
  double ground_stiffness_n_per_m{24000};
  double ground_damping_n_s_per_m{400};
  GroundShape ground{};
  double command_delay_s{0.002};
  double command_jitter_s{0};  ///< a command is late by delay + jitter * uniform(0, 1)
  double sensor_delay_s{0};
  double imu_delay_s{-1};  ///< below 0: as the encoders
  double frames_late{0};   ///< share of frames that come frames_late_s late
  double frames_late_s{0.001};
  double frames_repeated{0};  ///< share of frames in whose stead the bus tells the one before again
  double push_m_per_s{
      0};  ///< sd of one change of the trunk's speed, each walk, at a random time and direction
  double start_scatter_rad{0};
  double ambient_c{20};
  double pack_c{20};
  double trunk_inertia_ratio{1};
  double winding_start_c{25};
  std::array<double, 3> imu_tilt_rad{};  ///< mounting error about x, y, z
  bool position_source{false};
  double sensor_noise_ratio{1};                                   ///< times the robot file's noise and bias
  std::array<double, safety::kMaxJoints> strength{};              ///< times the drive's torque
  std::array<double, safety::kMaxJoints> damping_nm_s_per_rad{};  ///< of the joint
  std::array<double, safety::kMaxJoints> coulomb_nm{};
  std::array<double, safety::kMaxJoints> backlash_rad{};     ///< full width of the gap
  std::array<double, safety::kMaxJoints> gear_loss{};        ///< part of the drive's torque
  std::array<double, safety::kMaxJoints> stick_nm{};         ///< to break away, beyond Coulomb
  std::array<double, safety::kMaxJoints> link_ratio{};       ///< times mass and inertia of the joint's link
  std::array<double, safety::kMaxJoints> zero_offset_rad{};  ///< encoder reads this much too high
  int fault_count{0};
  std::array<Fault, kMaxFaults> fault{};
};

/// Everything as in the robot file: strength 1, the drives' own friction, level rubber-on-concrete floor, no
/// pushes, no scatter.
[[nodiscard]] Site nominal_site(const Model& model);

/// A checked scenario with its ranges drawn: each number a pure function of the seed and of its place among
/// the ranges (and of the joint's place in the robot). Without ranges it is the scenario itself.
[[nodiscard]] v1::Scenario drawn_scenario(const v1::Scenario& scenario, const Model& model,
                                          std::uint64_t seed);

/// The site of a checked scenario file, its ranges drawn by `seed`; what the file does not name is nominal.
[[nodiscard]] Site site_of(const v1::Scenario& scenario, const Model& model, std::uint64_t seed);

}  // namespace pastern::stub
