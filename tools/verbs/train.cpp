// train: a start policy from nothing for a robot file, by simulated walks on all cores.
#include "tools/train/train.h"

#include <fmt/format.h>

#include <chrono>
#include <csignal>

#include "tools/pastern/json.h"
#include "tools/pastern/verb.h"
#include "tools/pastern/words.h"
#include "tools/train/pool.h"

namespace pastern::tools {
namespace {

// The only thing that a handler may touch.
volatile std::sig_atomic_t interrupted = 0;
void on_interrupt(int) { interrupted = 1; }

class Train final : public Verb {
 public:
  const char* name() const override { return "train"; }
  const char* about() const override {
    return "Make a start policy from nothing for a robot file, by simulated walks.";
  }
  const char* group() const override { return "Before the first walk"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern train --robot hal_stub/robots/dunlin12.robot.txtpb --out mine.policy",
        "pastern train --robot my.robot.txtpb --out my.policy --seed 7 --threads 2",
        "mpirun -n 4 --hostfile machines pastern train --robot my.robot.txtpb --out my.policy",
        "pastern train --robot my.robot.txtpb --out small.policy --iterations 20 --directions 32",
        "",
        "Interrupted (Ctrl-C, a power cut) it goes on from OUT.training when called again in the same words.",
        "The same robot file and settings give the same policy file, byte for byte, on any number of "
        "threads; with other --instructions it is another one, as good.",
        "Under mpirun (Open MPI) the ranks share the walks, each on --threads threads: the same file again.",
        "Robot file and --training must be the same for all ranks; the first one writes.",
        "Exit status 5: interrupted. 3: a file is wrong or cannot be written.",
        "A policy that walks in simulation has walked on no robot: first start on a gantry, hand on the "
        "stop."};
  }
  void options(Options& options) override {
    TrainerSettings& settings = options_.settings;
    options.text("--robot", options_.robot, "Robot file (.robot.txtpb)", true)
        .text("--out", options_.out, "Policy file to write (.policy)", true)
        .text("--name", options_.name, "Name of the policy; its robot's name and _start when not said")
        .text("--training", options_.training,
              "Where the state is kept to go on from; OUT.training when not said")
        .whole("--seed", settings.seed, "Seed of everything random", 0, ~std::uint64_t{0})
        .whole("--iterations", iterations_, "Steps of the search", 1, 100000)
        .whole("--directions", directions_, "Pairs of walks a step", 2, 100000)
        .number("--sigma", settings.sigma, "Perturbation scale", 1e-6, 10)
        .number("--step", settings.step, "Step of Adam at the beginning", 1e-6, 10)
        .number("--last-step", settings.last_step, "and at the end", 1e-6, 10)
        .whole("--threads", threads_, "Threads; 0: one for each core", 0, 1024)
        .text("--instructions", instructions_,
              "Instructions that walks run with: plain, avx2, avx512 or neon; the widest when not said")
        .flag("--quiet", quiet_, "The result only")
        .flag("--json", json_, "Print each look and the result as JSON, one line each");
  }
  Exit run() override;

 private:
  void tell(const TrainProgress& progress);
  Exit finish(const TrainResult& result);

  TrainOptions options_;
  std::uint64_t iterations_{start_policy_settings().iterations};
  std::uint64_t directions_{start_policy_settings().directions};
  int threads_{0};
  std::string instructions_;
  bool quiet_{false};
  bool json_{false};
  bool speaks_{true};  // of the ranks of an mpirun one does
  std::chrono::steady_clock::time_point began_;
  std::uint32_t first_iteration_{0};
};

void Train::tell(const TrainProgress& progress) {
  if (first_iteration_ == 0) first_iteration_ = progress.iteration;
  if (progress.look == nullptr || quiet_) return;
  const v1::TrainingLook& look = *progress.look;
  if (json_) {
    say(json(look));
    return;
  }
  const double spent = std::chrono::duration<double>(std::chrono::steady_clock::now() - began_).count();
  const double made = progress.iteration - first_iteration_ + 1;
  const double left = spent / made * (progress.iterations - progress.iteration);
  say(fmt::format("{} {:>7} walks  return {:6.3f}  falls {:5.1f} %  {:5.2f} m/s  {}",
                  bar(progress.iteration, progress.iterations, 20), look.walks(), look.mean_return(),
                  100 * look.falls(), look.speed_m_per_s(),
                  progress.iteration < progress.iterations ? duration(left) + " left" : "done"));
}

Exit Train::finish(const TrainResult& result) {
  if (json_) {
    say(JsonObject()
            .add("policy", options_.out)
            .add("sha256", result.sha256_hex)
            .add("walks", result.walks)
            .add("mean_return", result.wide.mean_return)
            .add("return_error", result.wide.return_error)
            .add("falls", result.wide.falls)
            .add("nominal_return", result.nominal.mean_return)
            .add("nominal_speed_m_per_s", result.nominal.speed_m_per_s)
            .text());
    return Exit::done;
  }
  say(fmt::format(
      "Over {} drawn sites: return {:.3f} +- {:.3f}, falls {:.1f} %. Nominal site: return {:.3f}, "
      "{:.2f} m/s.",
      result.wide.walks, result.wide.mean_return, result.wide.return_error, 100 * result.wide.falls,
      result.nominal.mean_return, result.nominal.speed_m_per_s));
  say(fmt::format("{}  sha256 {}  {} walks", options_.out, brief_hash(result.sha256_hex), result.walks));
  suggest("check --robot " + options_.robot + " " + options_.out, "judge the file");
  return Exit::done;
}

Exit Train::run() {
  options_.settings.iterations = static_cast<std::uint32_t>(iterations_);
  options_.settings.directions = static_cast<std::size_t>(directions_);
  options_.threads = static_cast<unsigned>(threads_);
  std::string error;
  const auto set = packed::set_named(instructions_, error);
  if (!set) {
    complain("pastern train: --instructions: " + error);
    return Exit::usage;
  }
  options_.instructions = *set;
  const auto ranks = packed::Ranks::join(error);
  if (!ranks) {
    complain("pastern train: " + error);
    return Exit::internal;
  }
  options_.ranks = ranks->count() > 1 ? ranks.get() : nullptr;
  speaks_ = ranks->leads();
  options_.software = "pastern " PASTERN_VERSION;
  began_ = std::chrono::steady_clock::now();
  interrupted = 0;
  const auto before = std::signal(SIGINT, on_interrupt);
  files::Defects defects;
  const TrainResult result = run_train(
      options_,
      [this](const TrainProgress& progress) {
        if (progress.resumed && speaks_ && !quiet_ && !json_) {
          say(fmt::format("going on after iteration {}", progress.iteration - 1));
        }
        if (speaks_) tell(progress);
        return interrupted == 0;
      },
      defects);
  std::signal(SIGINT, before);
  for (const files::Defect& defect : defects) complain("pastern train: " + defect.line());
  if (!defects.empty()) return Exit::file_wrong;
  if (result.finished) return speaks_ ? finish(result) : Exit::done;
  if (!speaks_) return Exit::refused;
  complain(fmt::format("pastern train: interrupted after {} walks; the same command goes on from there",
                       result.walks));
  return Exit::refused;
}

}  // namespace

std::unique_ptr<Verb> make_train() { return std::make_unique<Train>(); }

}  // namespace pastern::tools
