// Promise: power cut at every sync point of a session of 12 walks, nothing lost, everything readable.
// Usage: bench_power_cut [--seed N] [--seeds N] [--quick]
#include <stdlib.h>

#include <CLI/CLI.hpp>
#include <cstdint>
#include <filesystem>
#include <string>

#include "tests/bench/promise.h"
#include "tests/faults/twelve_walks.h"

int main(int argc, char** argv) {
  CLI::App app("Power cut at every sync point of a session of 12 walks, unsynced writes dropped or torn.");
  std::uint64_t seeds = 20;
  std::uint64_t first = 1;
  bool quick = false;
  app.add_option("--seeds", seeds, "how many ways to tear at each sync point, of each of three kinds");
  app.add_option("--seed", first, "where the seeds begin");
  app.add_flag("--quick", quick, "one seed");
  CLI11_PARSE(app, argc, argv);
  if (quick) seeds = 1;

  std::string folder = (std::filesystem::temp_directory_path() / "pastern_power_cut_XXXXXX").string();
  if (mkdtemp(folder.data()) == nullptr) {
    std::fprintf(stderr, "%s: cannot be made\n", folder.c_str());
    return 70;
  }
  pastern::faults::PowerCutTrial trial(folder);
  std::uint64_t cuts = 0;
  std::uint64_t lost = 0;
  std::uint64_t unreadable = 0;
  std::uint64_t other = 0;
  for (std::uint64_t seed = first; seed < first + seeds; ++seed) {
    for (std::uint64_t n = 1; n <= trial.syncs(); ++n) {
      for (unsigned tear = 0; tear < 3; ++tear) {
        const pastern::faults::CutResult result = trial.cut(n, tear, seed * 1000003 + n * 3 + tear);
        cuts += result.cut ? 1 : 0;
        unreadable += result.unreadable ? 1 : 0;
        lost += !result.unreadable && !result.lost.empty() ? 1 : 0;
        other += result.other_result ? 1 : 0;
        if (!result.lost.empty())
          std::fprintf(stderr, "seed %llu sync %llu tear %u: %s\n", static_cast<unsigned long long>(seed),
                       static_cast<unsigned long long>(n), tear, result.lost.c_str());
      }
    }
  }
  std::filesystem::remove_all(folder);
  const bool ran = trial.syncs() > 0 && cuts == seeds * trial.syncs() * 3;
  pastern::bench::printed("power cut: sync points of the session; cuts",
                          std::to_string(trial.syncs()) + "; " + std::to_string(cuts));
  pastern::bench::promise("power cut at every sync point: sessions that lost a finished walk or another act",
                          std::to_string(lost), "0", ran && lost == 0);
  pastern::bench::promise("power cut at every sync point: journals unreadable", std::to_string(unreadable),
                          "0", ran && unreadable == 0);
  pastern::bench::promise("power cut at every sync point: continued sessions with another result",
                          std::to_string(other), "0", ran && other == 0);
  return 0;
}
