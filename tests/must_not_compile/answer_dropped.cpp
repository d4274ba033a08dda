// The word of a failed write in the durability path cannot be dropped.
#include "runtime/journal/journal.h"

bool keep(pastern::journal::Journal& journal) {
#ifdef OFFENDING
  journal.put("key", "value");
  return true;
#else
  return journal.put("key", "value").ok;
#endif
}
