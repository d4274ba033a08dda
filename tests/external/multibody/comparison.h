// The simulated robot against the reference: worst relative difference of accelerations over random states.
#pragma once

#include <cstdint>
#include <functional>
#include <string>

#include "tests/external/multibody/drawn.h"

namespace pastern::multibody {

/// A kind of body: a new one a call.
using Maker = std::function<v1::Robot(Lot&)>;

struct Shape {
  std::string name;
  Maker make;
};

/// The shipped robots and trees by lot; every tree that the simulated robot takes.
[[nodiscard]] const std::vector<Shape>& shapes();

struct Compared {
  double worst{0};  ///< relative; infinite when a number is not finite
  double reference{
      0};  ///< the same between the reference's two ways: what double arithmetic leaves uncertain
  int states{0};
  int bodies{0};
};

/// `loaded`: with the robot's rotors and joint friction, else neither. A new body every `states_a_body`
/// states.
[[nodiscard]] Compared compare(const Shape& shape, bool loaded, int states, int states_a_body,
                               std::uint64_t seed);

/// Largest |a - b| / max(1, |b|) over all entries (rad/s2, m/s2); infinite when one is not finite.
[[nodiscard]] double difference(const Accelerations& a, const Accelerations& b);

}  // namespace pastern::multibody
