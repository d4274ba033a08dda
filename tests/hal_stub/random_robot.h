// Robots by lot: valid robot files of any tree, and one of them thrashing on a ground by lot with everything
// that must hold watched.
#pragma once

#include <cstdint>
#include <random>
#include <string>

#include "pastern/v1/robot.pb.h"

namespace pastern::stub {

/// A robot file that the checks of robot files accept: 2 to 6 legs of 2 or 3 hinges; some on a waist; up to
/// two tails or masts whose joints turn or slide about any axis and may branch. Same seed, same robot.
[[nodiscard]] v1::Robot random_robot(std::uint64_t seed);

/// What became of it.
struct Thrashed {
  std::string refused;  ///< the line, when robot file or model was
  int joints{0};
  bool branches{false};
  bool slides{false};
  bool finite{true};
  double work_j{0};       ///< that the drives put in and took out, absolute
  double allowed_j{0};    ///< that the step may win by its order, over all the time
  double won_j{0};        ///< most that was won beyond it, from any moment to any later one
  double won_share{0};    ///< the same over half a step of the power exchanged within
  double depth_ratio{0};  ///< deepest that a point was, over the static depth: all the weight on one point
  double deep_s{0};       ///< longest that a point was deeper than 5 times that
};

/// Robot `seed` for `seconds` on its ground, the cycle `substeps` times as fast.
[[nodiscard]] Thrashed thrash(std::uint64_t seed, double seconds, int substeps = 1);

}  // namespace pastern::stub
