// Joint targets in radians are not torques in newton metres, though both are numbers a joint.
#include "safety/gate.h"

pastern::safety::DriveCommand ask(pastern::safety::Gate& gate, const pastern::safety::JointAngles<>& target,
                                  const pastern::safety::Torques<>& wanted) {
#ifdef OFFENDING
  return gate.judge({}, target, target, {}, {}, 0);
#else
  return gate.judge({}, wanted, target, {}, {}, 0);
#endif
}
