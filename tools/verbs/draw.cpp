// draw: a walk as a moving picture, simulated now or recorded in a journal.
#include <fmt/format.h>

#include "proto/files/durable.h"
#include "proto/files/policy_file.h"
#include "proto/files/scenario_file.h"
#include "tools/draw/picture.h"
#include "tools/pastern/copy.h"
#include "tools/pastern/words.h"
#include "tools/train/walk.h"

namespace pastern::tools {
namespace {

constexpr double kLongest_s = 60;

class Draw final : public Verb {
 public:
  const char* name() const override { return "draw"; }
  const char* about() const override {
    return "A walk as a picture that moves: simulated, or from a record.";
  }
  const char* group() const override { return "After a session"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern draw --robot R.robot.txtpb --policy P.policy --scenario S.scenario.txtpb",
        "pastern draw --robot R.robot.txtpb --policy P.policy --seed 7 --out seven.svg",
        "pastern draw --robot R.robot.txtpb --journal /var/lib/pastern --session 2 --walk 17",
        "",
        "With --policy a walk is simulated, on the nominal site without --scenario, and the ground's forces "
        "are drawn.",
        "With --journal a recorded walk is drawn as the robot believed it to be; forces are not recorded.",
        "The file is one SVG: it moves in any browser, and its strip of stills can be printed."};
  }
  void options(Options& options) override {
    options.text("--robot", robot_path_, "Robot file (.robot.txtpb)", true)
        .text("--policy", policy_path_, "Policy file to simulate")
        .text("--scenario", scenario_path_, "Site to simulate; the nominal one when not said")
        .whole("--seed", seed_, "Of the simulated walk", 0, ~std::uint64_t{0})
        .number("--seconds", seconds_, "Length of the simulated walk", 0.1, kLongest_s)
        .text("--journal", journal_, "Journal folder or file with the recorded walk")
        .whole("--session", session_, "Number of the session; 0: walks outside sessions", 0, 1000000000)
        .whole("--walk", walk_, "Number of the walk in it", 1, 1000000000)
        .text("--out", out_, "File to write");
  }
  Exit run() override;

 private:
  [[nodiscard]] std::optional<Scene> simulated(const files::RobotFile& robot) const;
  [[nodiscard]] std::optional<Scene> recorded(const files::RobotFile& robot) const;

  std::string robot_path_;
  std::string policy_path_;
  std::string scenario_path_;
  std::string journal_;
  std::string out_{"walk.svg"};
  std::uint64_t seed_{1};
  std::uint64_t session_{1};
  std::uint64_t walk_{1};
  double seconds_{5};
};

void tell(const files::Defects& defects) {
  for (const files::Defect& defect : defects) complain(defect.line());
}

std::string outcome_of(const Score& score) {
  return fmt::format(
      "return {:.2f} (forward {:.2f}, energy {:.2f}, drift {:.2f}, turn {:.2f}, fall {:.2f}); {:.2f} m{}",
      score.terms.total(), score.terms.forward, score.terms.energy, score.terms.drift, score.terms.turn,
      score.terms.fall, score.distance_m, score.fell ? "; it fell" : "");
}

std::optional<Scene> Draw::simulated(const files::RobotFile& robot) const {
  files::Defects defects;
  const auto policy = files::read_policy(policy_path_, robot, defects);
  std::optional<v1::Scenario> scenario;
  if (!scenario_path_.empty()) scenario = files::read_scenario(scenario_path_, robot, defects);
  tell(defects);
  if (!policy || (!scenario_path_.empty() && !scenario)) return std::nullopt;
  std::string error;
  const auto setting = WalkSetting::make(robot.robot(), policy->policy(), seconds_, error);
  if (!setting) {
    complain(fmt::format("pastern draw: {}: {}", robot_path_, error));
    return std::nullopt;
  }
  const stub::Site site =
      scenario ? stub::site_of(*scenario, setting->model(), seed_) : stub::nominal_site(setting->model());
  WalkCourse course(setting, one_site(site));
  Scene scene;
  scene.period_s = kStillPeriod_s;
  scene.forces = true;
  scene.slope_rad = site.slope_rad;
  course.watch([&scene](const stub::SimulatedRobot& walking, double time_s) {
    if (time_s + 1e-9 < kStillPeriod_s * static_cast<double>(scene.stills.size())) return;
    scene.stills.push_back(still_of(walking, time_s));
  });
  const Parameters parameters(policy->policy().parameters().begin(), policy->policy().parameters().end());
  const Score score = course.run(parameters, Lot{seed_, 0});
  describe(setting->model(), site.load_kg, scene);
  scene.title = fmt::format("{} on {}, simulated", robot.robot().name(),
                            scenario ? scenario->name() : "the nominal site");
  scene.lines = {fmt::format("policy {} ({}), seed {}", policy->policy().name(),
                             brief_hash(files::hex(policy->sha256())), seed_),
                 outcome_of(score)};
  return scene;
}

std::optional<Scene> Draw::recorded(const files::RobotFile& robot) const {
  std::string error;
  const auto model = stub::Model::make(robot.robot(), error);
  if (!model) {
    complain(fmt::format("pastern draw: {}: {}", robot_path_, error));
    return std::nullopt;
  }
  const auto copy = JournalCopy::from_folder(journal_, name());
  if (!copy) return std::nullopt;
  const std::string where =
      fmt::format("pastern draw: {}: session {}, walk {}", copy->source(), session_, walk_);
  for (const auto& row : copy->journal().sessions()) {
    if (row.session != session_ || row.robot_sha256_hex == files::hex(robot.sha256())) continue;
    complain(fmt::format("{}: walked by robot file {}, found {} ({}), expected that very file", where,
                         brief_hash(row.robot_sha256_hex), robot_path_,
                         brief_hash(files::hex(robot.sha256()))));
    return std::nullopt;
  }
  for (const auto& finished : copy->journal().finished(session_)) {
    const v1::Episode& episode = finished.episode;
    if (episode.walk() != walk_) continue;
    auto scene = recorded_scene(*model, episode.trace(), error);
    if (!scene) {
      complain(where + ": " + error);
      return std::nullopt;
    }
    scene->title = fmt::format("{}, session {}, walk {}, recorded", robot.robot().name(), session_, walk_);
    scene->lines = {fmt::format("return {:.2f}; {:.2f} m in {:.2f} s; as the robot believed it to be",
                                episode.terms().total(), episode.summary().distance_m(),
                                episode.summary().duration_s())};
    return scene;
  }
  complain(
      fmt::format("{}: found no such walk, expected 1 to {}", where, copy->journal().last_walk(session_)));
  return std::nullopt;
}

Exit Draw::run() {
  if (policy_path_.empty() == journal_.empty()) {
    complain("pastern draw: expected either --policy (a walk is simulated) or --journal (a recorded one)");
    return Exit::usage;
  }
  files::Defects defects;
  const auto robot = files::read_robot(robot_path_, defects);
  tell(defects);
  if (!robot) return Exit::file_wrong;
  const auto scene = journal_.empty() ? simulated(*robot) : recorded(*robot);
  if (!scene) return Exit::file_wrong;
  if (!files::write_durably(out_, picture_of(*scene), 0644, defects)) {
    tell(defects);
    return Exit::file_wrong;
  }
  for (const std::string& line : scene->lines) say(line);
  say(fmt::format("picture: {}  {} stills", out_, scene->stills.size()));
  return Exit::done;
}

}  // namespace

std::unique_ptr<Verb> make_draw() { return std::make_unique<Draw>(); }

}  // namespace pastern::tools
