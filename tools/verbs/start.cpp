// start: takes the baton, sends the plan, follows the session.
#include <fmt/format.h>

#include "proto/files/plan_file.h"
#include "proto/files/text.h"
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Start final : public LinkVerb {
 public:
  const char* name() const override { return "start"; }
  const char* about() const override {
    return "Begin a session from a plan file and follow it to its verdict.";
  }
  const char* group() const override { return "In a session"; }
  std::vector<std::string> examples() const override {
    return {"pastern start tools/plans/default.plan.txtpb",
            "pastern start tools/plans/operator-pace.plan.txtpb --host 10.0.0.7",
            "pastern start offer.plan.txtpb --candidate better.policy",
            "pastern start tools/plans/default.plan.txtpb --json > session.jsonl",
            "",
            "This process holds the baton and gives signs of life: when it ends, the robot stops.",
            "Ctrl-C is a controlled stop; a second Ctrl-C takes the torque off at once.",
            "Exit status 0: the verdict is adopt; 1: keep; 5: interrupted; 6: tripped."};
  }

 protected:
  void more_options(Options& options) override {
    options.text("plan", plan_path_, "Plan file (.plan.txtpb)", true)
        .text("--candidate", candidate_path_,
              "Policy file to offer, for a plan that only confirms a candidate")
        .flag("--quiet", choice_.quiet, "The verdict only")
        .flag("--brief", choice_.brief, "Progress, without a line a walk")
        .flag("--json", choice_.json, "Each message of the robot as one line of JSON");
  }
  Exit before() override;
  Exit run_on(RobotLine& line) override;

 private:
  std::string plan_path_;
  std::string candidate_path_;
  v1::Command command_;
  FollowChoice choice_;
};

Exit Start::before() {
  files::Defects defects;
  const auto plan = files::read_plan(plan_path_, defects);
  const auto text = plan ? files::read_whole(plan_path_, defects) : std::nullopt;
  const bool offers = plan && plan->adaptation().kind() == v1::Adaptation::OFFERED_CANDIDATE;
  std::optional<std::string> candidate;
  if (!candidate_path_.empty()) candidate = files::read_whole(candidate_path_, defects);
  if (plan && offers && candidate_path_.empty()) {
    complain(fmt::format("pastern start: {} confirms an offered candidate: expected --candidate FILE",
                         plan_path_));
    return Exit::usage;
  }
  if (plan && !offers && !candidate_path_.empty()) {
    complain(
        fmt::format("pastern start: --candidate: {} searches by itself and takes no candidate", plan_path_));
    return Exit::usage;
  }
  if (!defects.empty() || !text) {
    for (const files::Defect& defect : defects) complain(defect.line());
    return Exit::file_wrong;
  }
  command_.mutable_start_session()->set_plan_text(*text);
  if (candidate) command_.mutable_start_session()->set_candidate_policy(*candidate);
  return Exit::done;
}

Exit Start::run_on(RobotLine& line) {
  Exit exit = line.hold_baton();
  if (exit != Exit::done) return exit;
  v1::Status before;
  exit = line.status(before);
  if (exit != Exit::done) return exit;
  v1::Answer answer;
  exit = line.ask(command_, answer);
  if (exit != Exit::done) {
    suggest_after(before);
    return exit;
  }
  if (!choice_.json && !choice_.quiet) say(answer.words());
  choice_.commander = true;
  choice_.session = before.session() + 1;
  return follow(line, choice_);
}

}  // namespace

std::unique_ptr<Verb> make_start() { return std::make_unique<Start>(); }

}  // namespace pastern::tools
