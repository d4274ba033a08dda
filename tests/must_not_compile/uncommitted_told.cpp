// An adaptation operator takes nothing that is not on disk.
#include "runtime/adapt/operator.h"

bool tell(pastern::adapt::Operator& search, const pastern::Committed<pastern::Evaluation>& proof) {
#ifdef OFFENDING
  return search.observe(pastern::Evaluation(proof.value()));
#else
  return search.observe(proof);
#endif
}
