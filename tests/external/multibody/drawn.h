// Robots and states by lot: trees of legs of 1 to 4 hinges about any axis, with links that a body can have;
// states inside the joints' range, high over the floor.
#pragma once

#include <cstdint>
#include <random>
#include <string>

#include "pastern/v1/robot.pb.h"
#include "tests/external/multibody/motion.h"

namespace pastern::multibody {

class Lot {
 public:
  explicit Lot(std::uint64_t seed) : engine_(seed) {}
  double between(double low, double high) {
    return low + (high - low) * static_cast<double>(engine_() >> 11U) * 0x1p-53;
  }
  int whole(int low, int high) {
    return low + static_cast<int>(engine_() % static_cast<std::uint64_t>(high - low + 1));
  }
  bool chance(double p) { return between(0, 1) < p; }

 private:
  std::mt19937_64 engine_;
};

/// A robot file of hal_stub/robots as it is.
[[nodiscard]] v1::Robot shipped(const std::string& name);

/// What kind of tree. At most 32 joints come of it.
struct Kind {
  int legs{4};
  int least{1};  ///< joints in a limb
  int most{4};
  double sliding{0};    ///< share of joints that slide
  double branching{0};  ///< share of joints that carry one more, beside the limb's next
};

/// Half of the draws have limbs all of one kind (count, axes), which the simulated robot steps side by side
/// where there are four.
[[nodiscard]] v1::Robot drawn_robot(Lot& lot, const Kind& kind);

/// So that the drives neither limit a torque nor run hot: what is left are the equations of motion.
void unlimit(v1::Robot& robot);

[[nodiscard]] Motion drawn_motion(Lot& lot, const v1::Robot& robot);

}  // namespace pastern::multibody
