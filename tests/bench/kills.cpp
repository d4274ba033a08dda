// Promise: kill -9 of the onboard program at random times during sessions over the link, each resumed to its
// end: no finished walk is lost, and the journal's digest is that of a session never interrupted.
#include <CLI/CLI.hpp>
#include <string>

#include "tests/bench/promise.h"
#include "tests/faults/killed_session.h"

int main(int argc, char** argv) {
  CLI::App app("Kills the onboard program at random times during sessions and resumes them.");
  std::uint64_t seed = 1;
  std::uint64_t kills = 300;
  bool quick = false;
  std::string robot = "dunlin12";
  std::string scenario = "cold_store";
  app.add_option("--seed", seed, "of the times of the kills and of the simulated robot");
  app.add_option("--kills", kills, "how many");
  app.add_option("--robot", robot);
  app.add_option("--scenario", scenario);
  app.add_flag("--quick", quick, "30 kills");
  CLI11_PARSE(app, argc, argv);
  if (quick) kills = 30;

  const auto files = pastern::faults::shipped_files(PASTERN_SOURCE_DIR, PASTERN_BINARY_DIR, robot, scenario);
  pastern::faults::KillTally tally;
  if (!pastern::faults::kill_many(files, kills, seed, tally)) return 70;
  const auto number = [](std::uint64_t value) { return std::to_string(value); };
  pastern::bench::printed("kill -9 during sessions of " + number(tally.walks) + " walks",
                          number(tally.sum.kills) + " kills (" + number(tally.sum.during_walks) +
                              " after the first walk), " + number(tally.sessions) + " sessions");
  const bool enough = tally.sum.kills >= kills;
  pastern::bench::promise("kill -9, then resumed: finished walks lost; journals unreadable",
                          number(tally.sum.walks_lost) + "; " + number(tally.sum.unreadable), "0; 0",
                          enough && tally.sum.walks_lost == 0 && tally.sum.unreadable == 0);
  pastern::bench::promise("kill -9, then resumed: results that differ from the uninterrupted session",
                          number(tally.different) + " of " + number(tally.sessions), "0",
                          enough && tally.different == 0);
  return 0;
}
