// Reads, trains with a saved state at every look, judges, writes.
#include "tools/train/train.h"

#include <unistd.h>

#include <cmath>
#include <optional>

#include "proto/files/artefact.h"
#include "proto/files/durable.h"
#include "proto/files/text.h"
#include "proto/files/words.h"
#include "tools/train/draws.h"
#include "tools/train/packed_trials.h"
#include "tools/train/pool.h"
#include "tools/train/sites.h"
#include "tools/train/trot.h"
#include "tools/train/walk.h"

namespace pastern::tools {
namespace {

constexpr std::size_t kNominalWalks = 200;

Parameters parameters_of(const v1::Policy& policy) {
  return {policy.parameters().begin(), policy.parameters().end()};
}

bool exists(const std::string& path) { return ::access(path.c_str(), F_OK) == 0; }

// Goes on from the file when there is one. False: it is there but not this training's.
bool go_on(const std::string& path, const files::RobotFile& robot, const v1::Policy& start, Trainer& trainer,
           files::Defects& defects) {
  if (!exists(path)) return true;
  const auto bytes = files::read_whole(path, defects);
  v1::Training training;
  if (!bytes || !files::unpack_artefact(*bytes, files::kTrainingKind, path, training, defects)) return false;
  if (training.robot_sha256() != files::raw(robot.sha256())) {
    defects.push_back({path, "robot_sha256", "a training of another robot file",
                       robot.path() + ", or another --training file"});
    return false;
  }
  if (training.policy().SerializeAsString() != start.SerializeAsString()) {
    defects.push_back({path, "policy", "a training from another start point", "the robot's open-loop trot"});
    return false;
  }
  std::string error;
  if (trainer.restore(training, error)) return true;
  const std::size_t comma = error.rfind(", expected ");
  defects.push_back({path, "settings", error.substr(6, comma - 6), error.substr(comma + 11)});
  return false;
}

bool keep(const std::string& path, const files::RobotFile& robot, const v1::Policy& start,
          const Trainer& trainer, files::Defects& defects) {
  v1::Training training;
  training.set_robot_sha256(files::raw(robot.sha256()));
  *training.mutable_policy() = start;
  trainer.save(training);
  return files::write_durably(path, files::pack_artefact(files::kTrainingKind, training), 0644, defects);
}

std::string shown(double value) { return files::shown_number(std::round(value * 1000) / 1000); }

std::string how(const TrainOptions& options, const TrainResult& result) {
  return "From an open-loop trot by antithetic evolution strategies (arXiv:1910.01215) with Adam over "
         "randomised sites: " +
         options.settings.text() + ". Walks of " + shown(options.walk_s) + " s in simulation. Over " +
         std::to_string(result.wide.walks) + " drawn sites: mean return " + shown(result.wide.mean_return) +
         " +- " + shown(result.wide.return_error) + ", falls " + shown(result.wide.falls) +
         ". On the nominal site: mean return " + shown(result.nominal.mean_return) + ", " +
         shown(result.nominal.speed_m_per_s) + " m/s. Tried on no real robot.";
}

}  // namespace

TrainerSettings start_policy_settings() {
  TrainerSettings settings;
  settings.iterations = 140;
  settings.step = 0.02;
  settings.last_step = 0.003;
  settings.fall_penalty = 5;
  return settings;
}

namespace {

// One training, from the robot file to the policy file; each part says false when it cannot go on.
class Run {
 public:
  Run(const TrainOptions& options, files::Defects& defects)
      : options_(options),
        defects_(defects),
        threads_(options.threads > 0 ? options.threads : all_threads()),
        state_(options.training.empty() ? options.out + ".training" : options.training) {}

  bool prepare() {
    if (!all_are(read_files())) return false;
    trainer_.emplace(options_.settings, parameters_of(policy_), trials(drawn_sites(wide_ranges())));
    if (!all_are(go_on(state_, *robot_, policy_, *trainer_, defects_))) return false;
    if (options_.ranks == nullptr || options_.ranks->agree(beginning())) return true;
    refuse_ranks("a robot file, settings or a saved training that differ between ranks",
                 "the same on all, as in a shared folder");
    return false;
  }

  bool climb(const std::function<bool(const TrainProgress&)>& progress) {
    bool resumed = trainer_->iteration() > 0;
    std::size_t looks = trainer_->looks().size();
    for (bool more = true; more && !trainer_->done();) {
      trainer_->step();
      const bool looked = trainer_->looks().size() > looks;
      looks = trainer_->looks().size();
      more = !on_any(!progress({trainer_->iteration(), options_.settings.iterations, trainer_->walks(),
                                looked ? &trainer_->looks().back() : nullptr, resumed}));
      resumed = false;
      if ((looked || !more) && on_any(leads() && !keep(state_, *robot_, policy_, *trainer_, defects_))) {
        return false;
      }
    }
    return trainer_->done();
  }

  // On lots of a seed that neither iterations nor looks use.
  void judge(TrainResult& result) {
    const std::uint64_t seed = Draws(options_.settings.seed, Purpose::look, 1).word64();
    result.wide =
        look_at(*trials(drawn_sites(wide_ranges())), trainer_->best(), seed, 0, options_.last_look_walks);
    const stub::Site site = stub::nominal_site(setting_->model());
    result.nominal = look_at(*trials(one_site(site)), trainer_->best(), seed, 0, kNominalWalks);
  }

  void write(TrainResult& result) {
    policy_.mutable_parameters()->Assign(trainer_->best().begin(), trainer_->best().end());
    v1::Provenance& provenance = *policy_.mutable_provenance();
    provenance.set_made_by("train");
    provenance.set_seed(options_.settings.seed);
    provenance.set_walks(trainer_->walks());
    provenance.set_text(how(options_, result));
    provenance.set_software(options_.software);
    const std::string bytes = files::pack_policy(policy_);
    // Judged as any reader will judge it, before anything is written.
    if (!files::parse_policy(bytes, options_.out, *robot_, defects_)) return;
    if (leads()) {
      if (!files::write_durably(options_.out, bytes, 0644, defects_)) return;
      ::unlink(state_.c_str());
    }
    result.sha256_hex = files::hex(files::sha256(bytes));
    result.finished = true;
  }

  [[nodiscard]] std::uint64_t walks() const { return trainer_->walks(); }

 private:
  bool read_files() {
    robot_ = files::read_robot(options_.robot, defects_);
    if (!robot_) return false;
    policy_ = open_loop_trot(robot_->robot());
    if (!options_.name.empty()) policy_.set_name(options_.name);
    std::string error;
    setting_ = WalkSetting::make(robot_->robot(), policy_, options_.walk_s, error);
    if (setting_) return true;
    defects_.push_back({options_.robot, "", error, "a robot that can be simulated"});
    return false;
  }

  [[nodiscard]] std::unique_ptr<Trials> trials(SiteChoice choose) const {
    return packed_trials(setting_, std::move(choose), threads_, options_.instructions, options_.ranks);
  }
  [[nodiscard]] bool leads() const { return options_.ranks == nullptr || options_.ranks->leads(); }
  [[nodiscard]] bool on_any(bool here) const {
    return options_.ranks == nullptr ? here : options_.ranks->any(here);
  }
  // What ends one rank ends all: they wait for one another's walks.
  bool all_are(bool ready) {
    if (!on_any(!ready)) return true;
    if (ready) refuse_ranks("files that another rank could not take", "the same files on all ranks");
    return false;
  }
  void refuse_ranks(const char* found, const char* expected) {
    defects_.push_back({options_.robot, "", found, expected});
  }
  // All that the training will depend on from here.
  [[nodiscard]] std::string beginning() const {
    v1::Training training;
    trainer_->save(training);
    return files::raw(robot_->sha256()) + options_.settings.text() + policy_.SerializeAsString() +
           training.SerializeAsString();
  }

  const TrainOptions& options_;
  files::Defects& defects_;
  unsigned threads_;
  std::string state_;
  std::optional<files::RobotFile> robot_;
  v1::Policy policy_;
  std::shared_ptr<const WalkSetting> setting_;
  std::optional<Trainer> trainer_;
};

}  // namespace

TrainResult run_train(const TrainOptions& options, const std::function<bool(const TrainProgress&)>& progress,
                      files::Defects& defects) {
  TrainResult result;
  Run run(options, defects);
  if (!run.prepare()) return result;
  const bool done = run.climb(progress);
  result.walks = run.walks();
  if (!done) return result;
  run.judge(result);
  run.write(result);
  return result;
}

}  // namespace pastern::tools
