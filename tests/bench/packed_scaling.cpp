// Walks a second of one process with two threads, against two separate processes of one thread, and of two
// ranks of an mpirun against two threads.
//   bench_packed_scaling [--rounds N] [--walks N] [--seed N] [--set NAME] [--quick]
// In each round the three do the same walks, one after another; ratios are of a round, the median counts.
// Time is that on the wall from when all are ready until all have done their walks; for the two processes the
// sum of their own walks a second counts, which is the most that two can do.
#include <fcntl.h>
#include <fmt/format.h>
#include <sys/wait.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <array>
#include <chrono>
#include <cstdio>
#include <filesystem>
#include <optional>
#include <stdexcept>

#include "proto/files/policy_file.h"
#include "proto/files/robot_file.h"
#include "tests/bench/promise.h"
#include "tools/packed/fleet.h"
#include "tools/train/sites.h"

namespace pastern {
namespace {

constexpr double kWalk_s = 5;

struct Options {
  int rounds{7};
  std::size_t walks{2048};
  std::uint64_t seed{1};
  std::string set;
  std::string role;      // of a process that this bench starts itself
  std::size_t first{0};  // lot
};

double now_s() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

/// Fleet, policy and lots of a process.
class Yard {
 public:
  Yard(const Options& options, unsigned threads, const packed::Ranks* ranks) {
    const std::string folder = std::string(PASTERN_SOURCE_DIR) + "/hal_stub/";
    files::Defects defects;
    const auto robot = files::read_robot(folder + "robots/dunlin12.robot.txtpb", defects);
    if (!robot) throw std::runtime_error(files::lines(defects));
    const auto policy = files::read_policy(folder + "policies/dunlin12.policy", *robot, defects);
    if (!policy) throw std::runtime_error(files::lines(defects));
    parameters_.assign(policy->policy().parameters().begin(), policy->policy().parameters().end());
    std::string error;
    const auto settings = packed::walk_settings(robot->robot(), policy->policy(), kWalk_s, error);
    if (!settings) throw std::runtime_error(error);
    const auto set = packed::set_named(options.set, error);
    if (!set) throw std::runtime_error(error);
    fleet_.emplace(settings, tools::drawn_sites(tools::wide_ranges()),
                   packed::FleetOptions{threads, *set, packed::Numbers::single}, ranks);
    run(options.seed ^ 0x5eedU, 0, 64);  // everything is touched once
  }

  /// Seconds for walks of lots first .. first + walks - 1.
  double run(std::uint64_t seed, std::size_t first, std::size_t walks) {
    std::vector<packed::Trial> trials;
    for (std::size_t i = 0; i < walks; ++i) trials.push_back({&parameters_, {seed, first + i}});
    std::vector<tools::Score> scores(trials.size());
    const double begin = now_s();
    fleet_->run(trials, scores);
    return now_s() - begin;
  }

 private:
  Parameters parameters_;
  std::optional<packed::Fleet> fleet_;
};

/// A process of its own that does walks when it is told to.
class Helper {
 public:
  explicit Helper(const std::vector<std::string>& command) {
    std::array<int, 2> to{};
    std::array<int, 2> from{};
    if (::pipe2(to.data(), O_CLOEXEC) != 0 || ::pipe2(from.data(), O_CLOEXEC) != 0) {
      throw std::runtime_error("no pipe");
    }
    child_ = ::fork();
    if (child_ == 0) {
      ::dup2(to[0], 0);
      ::dup2(from[1], 1);
      std::vector<char*> words;
      for (const std::string& word : command) words.push_back(const_cast<char*>(word.c_str()));
      words.push_back(nullptr);
      ::execv(words[0], words.data());
      ::_exit(127);
    }
    ::close(to[0]);
    ::close(from[1]);
    to_ = ::fdopen(to[1], "w");
    from_ = ::fdopen(from[0], "r");
  }
  ~Helper() {
    std::fclose(to_);
    std::fclose(from_);
    int status = 0;
    ::waitpid(child_, &status, 0);
  }
  Helper(const Helper&) = delete;
  Helper& operator=(const Helper&) = delete;

  void go() {
    std::fputs("go\n", to_);
    std::fflush(to_);
  }
  /// The number that it says next.
  double answer() {
    double number = 0;
    if (std::fscanf(from_, "%lf", &number) != 1) throw std::runtime_error("a process of the bench has died");
    return number;
  }

 private:
  pid_t child_{-1};
  std::FILE* to_{nullptr};
  std::FILE* from_{nullptr};
};

bool told() {
  std::array<char, 8> line{};
  return std::fgets(line.data(), line.size(), stdin) != nullptr;
}

void say(double number) {
  std::printf("%.9f\n", number);
  std::fflush(stdout);
}

int process_role(const Options& options) {
  Yard yard(options, 1, nullptr);
  for (std::uint64_t round = 0; round < static_cast<std::uint64_t>(options.rounds); ++round) {
    say(0);
    if (!told()) return 0;
    say(yard.run(options.seed + round, options.first, options.walks));
  }
  return 0;
}

// One round: MPI's ranks do not rest while they wait, so none may be left over beside the others.
int rank_role(const Options& options) {
  std::string error;
  const auto ranks = packed::Ranks::join(error);
  if (!ranks) throw std::runtime_error(error);
  Yard yard(options, 1, ranks.get());
  static_cast<void>(ranks->agree("ready"));
  const double seconds = yard.run(options.seed, options.first, options.walks);
  if (ranks->leads()) say(seconds);
  return 0;
}

double median(std::vector<double> values) {
  std::sort(values.begin(), values.end());
  return values[values.size() / 2];
}

struct Measured {
  std::vector<double> threads, processes, ranks;  // walks a second
};

Measured measure(const Options& options) {
  const std::string self = std::filesystem::read_symlink("/proc/self/exe").string();
  const auto half = options.walks / 2;
  const auto command = [&](const std::string& role, std::uint64_t seed, std::size_t first,
                           std::size_t walks) {
    return std::vector<std::string>{self,
                                    "--role",
                                    role,
                                    "--rounds",
                                    std::to_string(options.rounds),
                                    "--seed",
                                    std::to_string(seed),
                                    "--first",
                                    std::to_string(first),
                                    "--walks",
                                    std::to_string(walks),
                                    "--set",
                                    options.set};
  };
  Yard yard(options, 2, nullptr);
  Helper one(command("process", options.seed, 0, half));
  Helper two(command("process", options.seed, half, half));
  one.answer();
  two.answer();
  Measured measured;
  const auto all = static_cast<double>(2 * half);
  for (int round = 0; round < options.rounds; ++round) {
    const std::uint64_t seed = options.seed + static_cast<std::uint64_t>(round);
    measured.threads.push_back(all / yard.run(seed, 0, 2 * half));
    one.go();
    two.go();
    measured.processes.push_back(all / 2 / one.answer() + all / 2 / two.answer());
    if (round + 1 < options.rounds) {
      one.answer();
      two.answer();
    }
#ifdef PASTERN_MPIRUN
    std::vector<std::string> mpirun = {PASTERN_MPIRUN, "-n", "2", "--bind-to", "none"};
    const auto rank = command("rank", seed, 0, 2 * half);
    mpirun.insert(mpirun.end(), rank.begin(), rank.end());
    measured.ranks.push_back(all / Helper(mpirun).answer());
#endif
  }
  return measured;
}

void tell(const Options& options, const Measured& measured) {
  constexpr double bar = 0.95;
  const auto ratio = [](const std::vector<double>& a, const std::vector<double>& b) {
    std::vector<double> ratios;
    for (std::size_t i = 0; i < a.size(); ++i) ratios.push_back(a[i] / b[i]);
    return median(ratios);
  };
  const double threads = ratio(measured.threads, measured.processes);
  bench::promise("packed walks a second: two threads against two processes", fmt::format("{:.3f} x", threads),
                 fmt::format(">= {} x", bar), threads >= bar);
  if (measured.ranks.empty()) {
    bench::printed("two ranks of MPI", "built without MPI");
  } else {
    const double ranks = ratio(measured.ranks, measured.threads);
    bench::promise("packed walks a second: two ranks against two threads", fmt::format("{:.3f} x", ranks),
                   fmt::format(">= {} x", bar), ranks >= bar);
  }
  bench::printed("walks a second of two threads; processes; ranks",
                 fmt::format("{:.0f}; {:.0f}; {:.0f}", median(measured.threads), median(measured.processes),
                             measured.ranks.empty() ? 0 : median(measured.ranks)));
  bench::printed("instructions, rounds, walks a round, seed",
                 fmt::format("{}, {}, {}, {}", options.set, options.rounds, options.walks, options.seed));
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  pastern::Options options;
  bool quick = false;
  CLI::App app{"Scaling of walks by lanes over threads, processes and ranks"};
  app.add_option("--rounds", options.rounds)->check(CLI::Range(1, 1000));
  app.add_option("--walks", options.walks, "of a round")->check(CLI::Range(2, 1000000));
  app.add_option("--seed", options.seed);
  app.add_option("--set", options.set, "plain, avx2, avx512; the widest when not given");
  app.add_flag("--quick", quick, "small: the figures mean little");
  app.add_option("--role", options.role)->group("");
  app.add_option("--first", options.first)->group("");
  CLI11_PARSE(app, argc, argv);
  if (quick) {
    options.rounds = 2;
    options.walks = 256;
  }
  // MPI as root, and with more ranks than cores.
  for (const char* name :
       {"OMPI_ALLOW_RUN_AS_ROOT", "OMPI_ALLOW_RUN_AS_ROOT_CONFIRM", "OMPI_MCA_rmaps_base_oversubscribe"}) {
    ::setenv(name, "1", 0);
  }
  try {
    if (options.role == "process") return pastern::process_role(options);
    if (options.role == "rank") return pastern::rank_role(options);
    std::string error;
    const auto set = pastern::packed::set_named(options.set, error);
    if (!set) throw std::runtime_error(error);
    options.set = pastern::packed::name_of(*set);
    pastern::tell(options, pastern::measure(options));
  } catch (const std::exception& failure) {
    std::fprintf(stderr, "bench_packed_scaling: %s\n", failure.what());
    return 1;
  }
  return 0;
}
