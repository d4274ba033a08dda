// Ticks -> EpisodeReturn. The sums are a template over the scalar, so that training scores by the same
// source.
#pragma once

#include <algorithm>
#include <cmath>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/robot.pb.h"
#include "runtime/types/body.h"
#include "runtime/types/episode.h"

namespace pastern::episode {

/// Weights of the robot file, see ReturnWeights in robot.proto.
struct Weights {
  double speed_cap_m_per_s{0.8};
  double energy_per_j{0.001};
  double drift_per_m_s{0.4};
  double turn_per_rad_s{0};
  double fall{1};
};
[[nodiscard]] Weights weights_of(const v1::Robot& robot);

/// Running sums of one walk in S. Costs are kept positive here and made negative in the terms.
template <class S>
struct ReturnSums {
  S forward{};
  S energy_j{};
  S drift{};
  S turn{};
};

/// What a tick adds: speed along the lane, sum over joints of |torque*speed|, distance from the lane's
/// middle, yaw. min and abs are found by argument-dependent lookup for a lane type.
template <class S>
struct TickScore {
  S speed_m_per_s{};
  S power_w{};
  S lateral_m{};
  S yaw_rad{};
};

template <class S>
void add(ReturnSums<S>& sums, const TickScore<S>& tick, const Weights& weights, double dt_s) noexcept {
  using std::abs;
  using std::min;
  sums.forward = sums.forward + min(tick.speed_m_per_s, S(weights.speed_cap_m_per_s)) * S(dt_s);
  sums.energy_j = sums.energy_j + tick.power_w * S(dt_s);
  sums.drift = sums.drift + abs(tick.lateral_m) * S(dt_s);
  sums.turn = sums.turn + abs(tick.yaw_rad) * S(dt_s);
}

/// `fell`: the fall term is taken; nothing was to be added after the fall.
[[nodiscard]] EpisodeReturn terms(const ReturnSums<double>& sums, const Weights& weights, bool fell);

}  // namespace pastern::episode
