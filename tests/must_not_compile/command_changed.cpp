// A command cannot be changed after the gate has made it.
#include "safety/gate.h"

double read_or_change(pastern::safety::Gate& gate) {
  pastern::safety::DriveCommand command = gate.judge({}, {}, {}, {}, {}, 0);
#ifdef OFFENDING
  command.torque()[0] = 100;
#endif
  return command.torque()[0];
}
