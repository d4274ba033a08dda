// Only the journal makes a Committed value.
#include "runtime/types/episode.h"

double total(const pastern::Committed<pastern::Evaluation>& proof) {
#ifdef OFFENDING
  const pastern::Committed<pastern::Evaluation> own(pastern::Evaluation{});
  return own.value().terms.total();
#else
  return proof.value().terms.total();
#endif
}
