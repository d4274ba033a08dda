// check: judges robot, policy, plan, scenario and URDF files; every defect in one line.
#include <fmt/format.h>
#include <fmt/ranges.h>
#include <unistd.h>

#include <algorithm>
#include <filesystem>
#include <optional>

#include "proto/files/plan_file.h"
#include "proto/files/policy_file.h"
#include "proto/files/robot_file.h"
#include "proto/files/scenario_file.h"
#include "tools/pastern/json.h"
#include "tools/pastern/verb.h"
#include "tools/pastern/words.h"
#include "tools/urdf/urdf_file.h"

namespace pastern::tools {
namespace {

namespace fs = std::filesystem;

enum class Kind { robot, scenario, plan, policy, urdf, unknown };

bool ends_with(const std::string& text, const std::string& end) {
  return text.size() >= end.size() && text.compare(text.size() - end.size(), end.size(), end) == 0;
}

Kind kind_of(const std::string& path) {
  if (ends_with(path, ".robot.txtpb")) return Kind::robot;
  if (ends_with(path, ".scenario.txtpb")) return Kind::scenario;
  if (ends_with(path, ".plan.txtpb")) return Kind::plan;
  if (ends_with(path, ".policy")) return Kind::policy;
  if (ends_with(path, ".urdf")) return Kind::urdf;
  return Kind::unknown;
}

const char* name_of(Kind kind) {
  switch (kind) {
    case Kind::robot:
      return "robot";
    case Kind::scenario:
      return "scenario";
    case Kind::plan:
      return "plan";
    case Kind::policy:
      return "policy";
    case Kind::urdf:
      return "urdf";
    case Kind::unknown:
      break;
  }
  return "unknown";
}

/// What came of one file.
struct Judged {
  std::string path;
  Kind kind{Kind::unknown};
  std::string about;  ///< in words, when sound
  std::string sha256_hex;
  std::string against;  ///< robot against which the defects are told, where there was a choice
  files::Defects defects;
  std::vector<std::string> still_missing;  ///< of a URDF file: what a robot file wants besides
};

class Check final : public Verb {
 public:
  const char* name() const override { return "check"; }
  const char* about() const override {
    return "Judge robot, policy, plan, scenario and URDF files: every defect in one line.";
  }
  const char* group() const override { return "Before the first walk"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern check hal_stub/robots/dunlin12.robot.txtpb",
        "pastern check tools/plans/*.plan.txtpb",
        "pastern check --robot my.robot.txtpb site.scenario.txtpb start.policy",
        "pastern check --json hal_stub/robots/*.robot.txtpb hal_stub/policies/*.policy",
        "pastern check arm.urdf",
        "",
        "A policy or a scenario is judged against its robot: --robot, else a robot file among the arguments,",
        "else the robot files in ../robots beside it. Of a URDF file it is told what a robot file cannot "
        "take and",
        "why, and what is still missing. Exit status 1: findings; 3: a file cannot be read."};
  }
  void options(Options& options) override {
    options
        .texts("file", files_,
               "Files, told apart by suffix: .robot.txtpb .scenario.txtpb .plan.txtpb .policy .urdf", true)
        .text("--robot", robot_, "Robot file for the policies and scenarios")
        .flag("--json", json_, "Print the findings as JSON");
  }
  Exit run() override;

 private:
  Judged judge(const std::string& path) const;
  void judge_robot(Judged& judged) const;
  void judge_plan(Judged& judged) const;
  void judge_policy(Judged& judged) const;
  void judge_scenario(Judged& judged) const;
  void judge_urdf(Judged& judged) const;
  std::vector<files::RobotFile> robots_for(const std::string& path) const;
  void print(const std::vector<Judged>& all) const;
  void print_json(const std::vector<Judged>& all) const;

  std::vector<std::string> files_;
  std::string robot_;
  bool json_{false};
};

/// Robot files that a policy or a scenario may belong to; those that are defective themselves are left out.
std::vector<files::RobotFile> Check::robots_for(const std::string& path) const {
  std::vector<std::string> paths;
  if (!robot_.empty()) {
    paths.push_back(robot_);
  } else {
    for (const std::string& file : files_) {
      if (kind_of(file) == Kind::robot) paths.push_back(file);
    }
  }
  if (paths.empty()) {
    std::error_code error;
    const fs::path beside = fs::absolute(path, error).parent_path().parent_path() / "robots";
    for (fs::directory_iterator at(beside, error), end; !error && at != end; at.increment(error)) {
      if (kind_of(at->path().string()) == Kind::robot) paths.push_back(at->path().string());
    }
  }
  std::vector<files::RobotFile> robots;
  for (const std::string& one : paths) {
    files::Defects ignored;
    if (auto robot = files::read_robot(one, ignored)) robots.push_back(std::move(*robot));
  }
  return robots;
}

void Check::judge_robot(Judged& judged) const {
  const auto robot = files::read_robot(judged.path, judged.defects);
  if (!robot) return;
  judged.sha256_hex = files::hex(robot->sha256());
  judged.about = fmt::format("{}: {} joints, {} legs, {:g} Hz", robot->robot().name(), robot->joint_count(),
                             robot->robot().legs_size(), robot->robot().cycle_hz());
}

void Check::judge_plan(Judged& judged) const {
  const auto plan = files::read_plan(judged.path, judged.defects);
  if (!plan) return;
  judged.about = fmt::format("{}: {} + {} + 2 x {} walks of {:g} s, at most {} falls, {:g} min", plan->name(),
                             plan->baseline_walks(), plan->search_walks(), plan->confirmation_pairs(),
                             plan->walk_s(), plan->max_falls(), plan->max_minutes());
}

/// Judged against every robot that may be its own. Returns the names of those that it fits; when it fits none
/// the defects against the one that fits best (fewest) are told, and which one that was.
template <class Read>
std::vector<std::string> judge_against(const std::vector<files::RobotFile>& robots, Judged& judged,
                                       Read read) {
  if (robots.empty()) {
    judged.defects.push_back({judged.path, "", "no sound robot file to judge it against", "--robot FILE"});
    return {};
  }
  std::vector<std::string> fits;
  std::optional<files::Defects> least;
  for (const files::RobotFile& robot : robots) {
    files::Defects defects;
    if (read(robot, defects) && defects.empty()) {
      fits.push_back(robot.robot().name());
    } else if (!least || defects.size() < least->size()) {
      least = defects;
      judged.against = robot.robot().name();
    }
  }
  if (fits.empty()) judged.defects = *least;
  return fits;
}

/// "dunlin12, dunlin8".
std::string listed(std::vector<std::string> names) {
  std::sort(names.begin(), names.end());
  return fmt::format("{}", fmt::join(names, ", "));
}

void Check::judge_policy(Judged& judged) const {
  const auto read = [&](const files::RobotFile& robot, files::Defects& defects) {
    const auto policy = files::read_policy(judged.path, robot, defects);
    if (!policy) return false;
    judged.sha256_hex = files::hex(policy->sha256());
    judged.about =
        fmt::format("{} for {}: {} parameters, {} channels, {:g} Hz, gait {:g} Hz", policy->policy().name(),
                    policy->policy().robot(), policy->policy().parameters_size(),
                    policy->policy().channels_size(), policy->policy().rate_hz(), policy->policy().gait_hz());
    return true;
  };
  (void)judge_against(robots_for(judged.path), judged, read);
}

void Check::judge_scenario(Judged& judged) const {
  std::string scenario_name;
  const std::vector<files::RobotFile> robots = robots_for(judged.path);
  const auto read = [&](const files::RobotFile& robot, files::Defects& defects) {
    const auto scenario = files::read_scenario(judged.path, robot, defects);
    if (!scenario) return false;
    scenario_name = scenario->name();
    return true;
  };
  const std::vector<std::string> fits = judge_against(robots, judged, read);
  judged.about = fmt::format("{}: fits {}", scenario_name, listed(fits));
  std::vector<std::string> others;
  for (const files::RobotFile& robot : robots) {
    const std::string& name = robot.robot().name();
    if (std::find(fits.begin(), fits.end(), name) == fits.end()) others.push_back(name);
  }
  if (!others.empty()) judged.about += "; does not fit " + listed(others);
}

void Check::judge_urdf(Judged& judged) const {
  const auto urdf = read_urdf(judged.path, judged.defects);
  if (!urdf) return;
  judged.about = fmt::format("{}: {} joints, {} links, {:g} kg", urdf->robot.name(),
                             urdf->robot.joints_size(), urdf->links, urdf->mass_kg);
  judged.still_missing = urdf->still_missing;
}

Judged Check::judge(const std::string& path) const {
  Judged judged;
  judged.path = path;
  judged.kind = kind_of(path);
  if (access(path.c_str(), R_OK) != 0 && judged.kind != Kind::unknown) {
    judged.defects.push_back({path, "", "no file that can be read", "one"});
    return judged;
  }
  switch (judged.kind) {
    case Kind::robot:
      judge_robot(judged);
      break;
    case Kind::plan:
      judge_plan(judged);
      break;
    case Kind::policy:
      judge_policy(judged);
      break;
    case Kind::scenario:
      judge_scenario(judged);
      break;
    case Kind::urdf:
      judge_urdf(judged);
      break;
    case Kind::unknown:
      break;
  }
  if (!judged.defects.empty()) judged.about.clear();
  return judged;
}

/// Lines of several fields, no longer than a terminal is wide.
void say_missing(const Judged& judged) {
  if (judged.still_missing.empty()) return;
  say(fmt::format("{}: URDF does not say, and a robot file needs besides:", judged.path));
  std::string line;
  for (const std::string& field : judged.still_missing) {
    if (!line.empty() && line.size() + field.size() > 96) {
      say("  " + line);
      line.clear();
    }
    line += (line.empty() ? "" : ", ") + field;
  }
  say("  " + line);
}

void Check::print(const std::vector<Judged>& all) const {
  std::size_t findings = 0;
  for (const Judged& one : all) {
    findings += one.defects.size();
    const std::string against = one.against.empty() ? "" : "  (judged against " + one.against + ")";
    for (const files::Defect& defect : one.defects) say(defect.line() + against);
    if (one.defects.empty()) {
      const std::string hash =
          one.sha256_hex.empty() ? "" : fmt::format("  sha256 {}", brief_hash(one.sha256_hex));
      say(fmt::format("{}: sound  {}{}", one.path, one.about, hash));
      say_missing(one);
    }
  }
  if (findings > 0) {
    say(fmt::format("{} finding{} in {} file{}", findings, findings == 1 ? "" : "s", all.size(),
                    all.size() == 1 ? "" : "s"));
    std::string again = "check";
    for (const std::string& file : files_) again += " " + file;
    suggest(again, "again, when it is mended");
  } else {
    suggest("status", "is the robot there, and what is it waiting for");
  }
}

void Check::print_json(const std::vector<Judged>& all) const {
  std::vector<std::string> entries;
  for (const Judged& one : all) {
    std::vector<std::string> defects;
    for (const files::Defect& d : one.defects) {
      defects.push_back(JsonObject()
                            .add("file", d.file)
                            .add("field", d.field)
                            .add("found", d.found)
                            .add("expected", d.expected)
                            .text());
    }
    std::vector<std::string> missing;
    for (const std::string& field : one.still_missing) missing.push_back(json(field));
    entries.push_back(JsonObject()
                          .add("file", one.path)
                          .add("kind", name_of(one.kind))
                          .add("sound", one.defects.empty())
                          .add("about", one.about)
                          .add("sha256", one.sha256_hex)
                          .add("judged_against", one.defects.empty() ? std::string() : one.against)
                          .raw("defects", json_list(defects))
                          .raw("still_missing", json_list(missing))
                          .text());
  }
  say(JsonObject().raw("files", json_list(entries)).text());
}

Exit Check::run() {
  for (const std::string& path : files_) {
    if (kind_of(path) != Kind::unknown) continue;
    complain(
        fmt::format("pastern check: {}: unknown suffix: expected .robot.txtpb, .scenario.txtpb, .plan.txtpb, "
                    ".policy or .urdf",
                    path));
    return Exit::usage;
  }
  std::vector<Judged> all;
  bool unreadable = false;
  bool findings = false;
  for (const std::string& path : files_) {
    all.push_back(judge(path));
    std::error_code error;
    unreadable = unreadable || access(path.c_str(), R_OK) != 0 || !fs::is_regular_file(path, error);
    findings = findings || !all.back().defects.empty();
  }
  if (!robot_.empty()) {
    Judged robot = judge(robot_);
    unreadable = unreadable || kind_of(robot_) != Kind::robot || access(robot_.c_str(), R_OK) != 0;
    if (!robot.defects.empty()) findings = true, all.insert(all.begin(), std::move(robot));
  }
  json_ ? print_json(all) : print(all);
  if (unreadable) return Exit::file_wrong;
  return findings ? Exit::findings : Exit::done;
}

}  // namespace

std::unique_ptr<Verb> make_check() { return std::make_unique<Check>(); }

}  // namespace pastern::tools
