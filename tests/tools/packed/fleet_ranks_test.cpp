// Walks over the ranks of an mpirun against the same walks in this process alone, to the bit, on every rank.
#include <cstdio>

#include "tests/tools/packed/fleet_fixture.h"

int main() {
  using namespace pastern::packed;
  std::string error;
  const auto ranks = Ranks::join(error);
  if (!ranks) {
    std::fprintf(stderr, "%s\n", error.c_str());
    return 70;
  }
  const test::Field field;
  const auto sites = pastern::tools::drawn_sites(pastern::tools::wide_ranges());
  const auto trials = field.trials(45);
  Fleet shared(field.settings, sites, {1, widest_set(), Numbers::single}, ranks.get());
  const auto together = test::scores_of(shared, trials);
  Fleet own(field.settings, sites, {1, shared.set(), Numbers::single});
  const auto alone = test::scores_of(own, trials);
  int wrong = 0;
  int fell = 0;
  for (std::size_t i = 0; i < trials.size(); ++i) {
    wrong += test::same(together[i], alone[i]) ? 0 : 1;
    fell += alone[i].fell ? 1 : 0;
  }
  std::printf("rank %d of %d: %zu walks, %d fell, %d other than alone\n", ranks->rank(), ranks->count(),
              trials.size(), fell, wrong);
  return wrong == 0 && fell > 0 ? 0 : 1;
}
