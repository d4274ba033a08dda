// Wiring of a session without threads.
#include "runtime/session/in_process.h"

#include <google/protobuf/text_format.h>

#include <cstdlib>
#include <filesystem>
#include <system_error>
#include <utility>

namespace pastern::session {
namespace {

class Folder {
 public:
  explicit Folder(const std::string& kept) : path_(kept) {
    if (!kept.empty()) return;
    const bool memory = std::filesystem::is_directory("/dev/shm");
    std::string pattern = std::string(memory ? "/dev/shm" : "/tmp") + "/pastern-session-XXXXXX";
    if (mkdtemp(pattern.data()) == nullptr) return;
    path_ = pattern;
    temporary_ = true;
  }
  ~Folder() {
    std::error_code ignored;
    if (temporary_) std::filesystem::remove_all(path_, ignored);
  }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  [[nodiscard]] const std::string& path() const { return path_; }

 private:
  std::string path_;
  bool temporary_{false};
};

class Listener final : public Hooks {
 public:
  Listener(const InProcess& given, InProcessResult& result) : given_(given), result_(result) {}
  bool leave() override { return leave_; }
  void on_episode(const v1::Episode& episode) override {
    if (given_.after_walk && !given_.after_walk(episode)) leave_ = true;
    result_.episodes.push_back(episode);
  }
  void on_verdict(const v1::Verdict& verdict) override { result_.verdict = verdict; }

 private:
  const InProcess& given_;
  InProcessResult& result_;
  bool leave_{false};
};

Ended run_with(const InProcess& given, journal::Journal& journal, InProcessResult& result) {
  std::string error;
  auto drives = hal::Drives::open(
      drives_config(*given.robot, given.plugin, given.plugin_options, given.plugin_seed, Pace::stepped),
      error);
  if (!drives) return {Ended::How::refused, error};
  if (!drives->simulated())
    return {Ended::How::refused, given.plugin + ": found real drives, expected simulated"};
  const journal::FirstStart first{files::hex(given.robot->sha256()), "in process, simulated robot",
                                  "simulated"};
  const journal::Written confirmed = journal.confirm_first_start(first);
  if (!confirmed.ok) return {Ended::How::failed, confirmed.words};
  Cycle cycle(given.robot->robot(), given.start->policy(), std::move(drives), Pace::stepped);
  const std::unique_ptr<Mover> mover = make_stepped_mover(cycle);
  Listener listener(given, result);
  Runner runner(*given.robot, *mover, journal, listener);
  if (!runner.restore_failure().empty()) return {Ended::How::refused, runner.restore_failure()};
  if (given.resume) return runner.resume();
  std::string plan_text;
  if (!google::protobuf::TextFormat::PrintToString(given.plan, &plan_text)) {
    return {Ended::How::refused, "the plan cannot be written as text"};
  }
  SessionSetup setup{given.plan, plan_text, *given.start, {}};
  if (given.candidate != nullptr) setup.candidate = *given.candidate;
  return runner.run(setup);
}

}  // namespace

hal::DrivesConfig drives_config(const files::RobotFile& robot, const std::string& plugin,
                                const std::string& options, std::uint64_t seed, Pace pace) {
  hal::DrivesConfig config;
  config.plugin = plugin;
  for (const v1::Joint& joint : robot.robot().joints()) config.joint_names.push_back(joint.name());
  config.period_s = 1.0 / robot.robot().cycle_hz();
  config.drive_timeout_s = robot.robot().guard().drive_timeout_s();
  config.robot_file = robot.path();
  config.options = options;
  config.seed = seed;
  config.stepped = pace == Pace::stepped;
  return config;
}

InProcessResult run_session_in_process(const InProcess& given) {
  InProcessResult result;
  const Folder folder(given.journal_folder);
  std::string error;
  const std::unique_ptr<journal::Journal> journal = journal::Journal::open(folder.path(), error, given.vfs);
  if (!journal) {
    result.ended = {Ended::How::failed, error};
    return result;
  }
  result.ended = run_with(given, *journal, result);
  const std::optional<journal::SessionRow> row = journal->last_session();
  if (row) result.digest = journal->digest(row->session);
  if (result.verdict && !result.verdict->adapted_sha256().empty()) {
    result.adapted_bytes = journal->policy(files::hex(result.verdict->adapted_sha256())).value_or("");
  }
  return result;
}

}  // namespace pastern::session
