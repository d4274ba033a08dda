// Weights from the robot file; the terms of a return.
#include "runtime/episode/score.h"

namespace pastern::episode {

Weights weights_of(const v1::Robot& robot) {
  const v1::ReturnWeights& weights = robot.return_weights();
  return {weights.speed_cap_m_per_s(), weights.energy_per_j(), weights.drift_per_m_s(),
          weights.turn_per_rad_s(), weights.fall()};
}

EpisodeReturn terms(const ReturnSums<double>& sums, const Weights& weights, bool fell) {
  // 0 - x, so that a cost of nothing is 0 and not -0: it is printed.
  return {sums.forward, 0 - weights.energy_per_j * sums.energy_j, 0 - weights.drift_per_m_s * sums.drift,
          0 - weights.turn_per_rad_s * sums.turn, fell ? 0 - weights.fall : 0.0};
}

}  // namespace pastern::episode
