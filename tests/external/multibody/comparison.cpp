#include "tests/external/multibody/comparison.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "tests/external/multibody/reference.h"
#include "tests/external/multibody/simulated.h"

namespace pastern::multibody {
namespace {

double entry(double a, double b) {
  const double d = std::fabs(a - b) / std::max(1.0, std::fabs(b));
  return d < std::numeric_limits<double>::infinity() ? d : std::numeric_limits<double>::infinity();
}

Drives drawn_drives(Lot& lot, const v1::Robot& robot, const Motion& motion, const Simulated& simulated) {
  Drives drives;
  for (const auto& joint : robot.joints()) {
    drives.torque.push_back(lot.between(-30, 30));
    drives.rotor.push_back(joint.drive().rotor_inertia_kg_m2());
  }
  drives.viscosity = simulated.viscosity(motion);
  return drives;
}

}  // namespace

double difference(const Accelerations& a, const Accelerations& b) {
  double worst = 0;
  for (std::size_t i = 0; i < a.trunk.size(); ++i) worst = std::max(worst, entry(a.trunk[i], b.trunk[i]));
  for (std::size_t j = 0; j < b.joint.size(); ++j) worst = std::max(worst, entry(a.joint.at(j), b.joint[j]));
  return worst;
}

const std::vector<Shape>& shapes() {
  static const std::vector<Shape> all{
      {"dunlin12", [](Lot&) { return shipped("dunlin12"); }},
      {"dunlin8", [](Lot&) { return shipped("dunlin8"); }},
      {"4 legs of 1 to 4 joints", [](Lot& lot) { return drawn_robot(lot, {.legs = 4}); }},
      {"8 legs of 1 to 4 joints", [](Lot& lot) { return drawn_robot(lot, {.legs = 8}); }},
      {"1 to 8 legs of 1 to 4 joints", [](Lot& lot) { return drawn_robot(lot, {.legs = lot.whole(1, 8)}); }},
  };
  return all;
}

Compared compare(const Shape& shape, bool loaded, int states, int states_a_body, std::uint64_t seed) {
  Lot lot(seed);
  Compared compared;
  while (compared.states < states) {
    v1::Robot robot = shape.make(lot);
    unlimit(robot);
    if (!loaded) {
      for (auto& joint : *robot.mutable_joints()) joint.mutable_drive()->set_rotor_inertia_kg_m2(0);
    }
    Simulated simulated(robot);
    simulated.set_friction(loaded);
    Reference reference(robot);
    ++compared.bodies;
    for (int k = 0; k < states_a_body && compared.states < states; ++k, ++compared.states) {
      const Motion motion = drawn_motion(lot, robot);
      const Drives drives = drawn_drives(lot, robot, motion, simulated);
      const Accelerations recursive = reference.by_recursion(motion, drives);
      const Accelerations dense = reference.by_mass_matrix(motion, drives);
      compared.reference = std::max(compared.reference, difference(dense, recursive));
      for (const Way way : {Way::plain, Way::fitted}) {
        compared.worst =
            std::max(compared.worst, difference(simulated.accelerations(motion, drives, way), recursive));
      }
    }
  }
  return compared;
}

}  // namespace pastern::multibody
