// The drives take a gate's command, not torques.
#include "runtime/hal/drives.h"
#include "safety/gate.h"

bool send(pastern::hal::Drives& drives, pastern::safety::Gate& gate,
          const pastern::safety::Torques<>& torques) {
#ifdef OFFENDING
  return drives.write(torques);
#else
  return drives.write(gate.judge({}, torques, {}, {}, {}, 0));
#endif
}
