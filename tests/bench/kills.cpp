// Promise: kill -9 of the onboard program at random times during sessions over the link, each resumed to its
// end: no finished walk is lost, and the journal's digest is that of a session never interrupted.
#include <stdlib.h>

#include <CLI/CLI.hpp>
#include <filesystem>
#include <fstream>
#include <random>

#include "tests/bench/promise.h"
#include "tests/faults/killed_session.h"

namespace {

constexpr const char* kPlan = R"(name: "kills"
adaptation { kind: ES_GRADIENT batch: 3 }
seed: 1
walk_s: 2
baseline_walks: 2
search_walks: 12
confirmation_pairs: 5
confirmation_level: 0.05
max_falls: 1000
max_minutes: 60
max_void_repeats: 3
go_by: AUTO
)";

std::string fresh_folder() {
  std::string folder = (std::filesystem::temp_directory_path() / "pastern_kills_XXXXXX").string();
  return mkdtemp(folder.data()) != nullptr ? folder : "";
}

}  // namespace

int main(int argc, char** argv) {
  using pastern::faults::KillResult;
  CLI::App app("Kills the onboard program at random times during sessions and resumes them.");
  std::uint64_t seed = 1;
  std::uint64_t kills = 300;
  bool quick = false;
  std::string scenario = "cold_store";
  const std::string source = PASTERN_SOURCE_DIR;
  const std::string binary = PASTERN_BINARY_DIR;
  std::string robot = "dunlin12";
  app.add_option("--seed", seed, "of the times of the kills and of the simulated robot");
  app.add_option("--kills", kills, "how many");
  app.add_option("--robot", robot);
  app.add_option("--scenario", scenario);
  app.add_flag("--quick", quick, "30 kills");
  CLI11_PARSE(app, argc, argv);
  if (quick) kills = 30;

  const pastern::faults::OnboardFiles files{
      binary + "/bin/pastern-onboard", source + "/hal_stub/robots/" + robot + ".robot.txtpb",
      source + "/hal_stub/policies/" + robot + ".policy", binary + "/lib/libpastern_hal_stub.so",
      source + "/hal_stub/scenarios/" + scenario + ".scenario.txtpb"};
  const auto session = [&](const std::function<double()>& delay_s) {
    const std::string folder = fresh_folder();
    KillResult result = pastern::faults::run_killed_session(files, folder, kPlan, seed, delay_s);
    if (!result.trouble.empty()) std::fprintf(stderr, "%s: %s\n", folder.c_str(), result.trouble.c_str());
    std::filesystem::remove_all(folder);
    return result;
  };

  const KillResult whole = session([] { return -1.0; });
  if (!whole.trouble.empty()) return 70;
  std::mt19937_64 engine(seed);
  KillResult all;
  std::uint64_t sessions = 0;
  std::uint64_t different = 0;
  while (all.kills < kills) {
    std::uint64_t left = std::min<std::uint64_t>(kills - all.kills, 12);
    const KillResult one = session([&] {
      if (left == 0) return -1.0;
      --left;
      return std::uniform_real_distribution<double>(0, 0.25 * whole.seconds)(engine);
    });
    ++sessions;
    all.kills += one.kills;
    all.during_walks += one.during_walks;
    all.walks_lost += one.walks_lost;
    all.unreadable += one.unreadable;
    different += one.digest != whole.digest ? 1 : 0;
  }
  pastern::bench::printed("kill -9 during sessions",
                          std::to_string(all.kills) + " kills (" + std::to_string(all.during_walks) +
                              " between walks 1 and " + std::to_string(whole.walks) + "), " +
                              std::to_string(sessions) + " sessions");
  pastern::bench::promise("kill -9, then resumed: finished walks lost; journals unreadable",
                          std::to_string(all.walks_lost) + "; " + std::to_string(all.unreadable), "0; 0",
                          all.walks_lost == 0 && all.unreadable == 0);
  pastern::bench::promise("kill -9, then resumed: results that differ from the uninterrupted session",
                          std::to_string(different) + " of " + std::to_string(sessions), "0", different == 0);
  return 0;
}
