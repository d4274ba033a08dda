// Promises of the dry run: how many sessions on cold_store end with "adopt", how long one takes, and that the
// same seed gives the same journal.
#include <CLI/CLI.hpp>
#include <algorithm>
#include <chrono>
#include <mutex>

#include "tests/bench/promise.h"
#include "tests/bench/sessions.h"

namespace {

using pastern::bench::Ground;

struct Tally {
  std::uint64_t adopted{0};
  std::uint64_t ended{0};
  std::uint64_t falls{0};
  std::vector<double> effects;
  std::vector<std::string> digests;
};

Tally run_all(const Ground& ground, std::uint64_t seed, std::uint64_t count, unsigned threads) {
  Tally tally;
  tally.digests.resize(count);
  std::mutex mutex;
  pastern::bench::in_parallel(count, threads, [&](std::uint64_t i) {
    const auto result = pastern::session::run_session_in_process(ground.session(seed + i));
    const std::lock_guard lock(mutex);
    std::fprintf(stderr, "%s seed %llu: %s\n", ground.plan->name().c_str(),
                 static_cast<unsigned long long>(seed + i), result.ended.words.c_str());
    tally.digests[i] = result.digest;
    for (const auto& episode : result.episodes) tally.falls += episode.outcome() == pastern::v1::FELL ? 1 : 0;
    if (!result.verdict) return;
    ++tally.ended;
    tally.adopted += result.verdict->kind() == pastern::v1::Verdict::ADOPT ? 1 : 0;
    if (result.verdict->pairs() > 0) tally.effects.push_back(result.verdict->effect());
  });
  std::sort(tally.effects.begin(), tally.effects.end());
  return tally;
}

std::string words_of(const Tally& tally, std::uint64_t count) {
  const double median = tally.effects.empty() ? 0 : tally.effects[tally.effects.size() / 2];
  char words[160];
  std::snprintf(words, sizeof words, "%llu of %llu (median effect %+.2f, falls %llu)",
                static_cast<unsigned long long>(tally.adopted), static_cast<unsigned long long>(count),
                median, static_cast<unsigned long long>(tally.falls));
  return words;
}

bool time_one(Ground ground, std::uint64_t seed) {
  ground.plan->set_search_walks(70);  // and 5 + 16 others; whole batches of ten
  ground.plan->set_max_falls(1000);   // it is to walk all of them
  const auto began = std::chrono::steady_clock::now();
  const auto result = pastern::session::run_session_in_process(ground.session(seed));
  const double seconds = std::chrono::duration<double>(std::chrono::steady_clock::now() - began).count();
  char words[80];
  std::snprintf(words, sizeof words, "%.1f s (%zu walks)", seconds, result.episodes.size());
  return pastern::bench::promise("dry-run session of 90 walks at stepped pace", words, "<= 15 s",
                                 result.verdict && result.episodes.size() >= 90 && seconds <= 15);
}

}  // namespace

int main(int argc, char** argv) {
  CLI::App app("Dry runs of the session's default operator, and of batch hill climbing beside it.");
  std::uint64_t seed = 1;
  std::uint64_t count = 50;
  unsigned threads = 2;
  bool quick = false;
  std::string robot = "dunlin12";
  std::string scenario = "cold_store";
  app.add_option("--seed", seed, "seed of the first session");
  app.add_option("--count", count, "sessions");
  app.add_option("--threads", threads, "threads");
  app.add_option("--robot", robot);
  app.add_option("--scenario", scenario);
  app.add_flag("--quick", quick, "3 sessions");
  CLI11_PARSE(app, argc, argv);
  if (quick) count = 3;

  Ground ground;
  Ground batch;
  if (!ground.load(robot, scenario, "default") || !batch.load(robot, scenario, "batch")) return 70;
  time_one(ground, seed);
  const Tally first = run_all(ground, seed, count, threads);
  pastern::bench::promise("dry run of " + scenario + ": verdict adopt, at most 50 search walks",
                          words_of(first, count), count == 50 ? ">= 40" : ">= 80 %",
                          10 * first.adopted >= 8 * count);
  pastern::bench::printed("the same with batch hill climbing",
                          words_of(run_all(batch, seed, count, threads), count));

  const std::uint64_t again = std::min<std::uint64_t>(count, 5);
  const Tally second = run_all(ground, seed, again, 1);
  bool equal = true;
  for (std::size_t i = 0; i < again; ++i)
    equal = equal && !first.digests[i].empty() && first.digests[i] == second.digests[i];
  pastern::bench::promise(
      "same seed, same journal content (digest), " + std::to_string(again) + " sessions twice",
      equal ? "equal" : "different", "equal", equal);
  return first.ended == count ? 0 : 70;
}
