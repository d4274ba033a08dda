// What the hostile plug-in tells the test about the last tick. Found by dlsym in the plug-in that is loaded
// already.
#pragma once

#include "runtime/hal/pastern_hal.h"

struct HostileTick {
  pastern_hal_command command; /* the last one written */
  bool forbids_torque;         /* what read gave in this tick leaves no choice: off at once */
  bool write_failed;           /* and the next tick must be off */
};
using HostileLast = const HostileTick* (*)();
