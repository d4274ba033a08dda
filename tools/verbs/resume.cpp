// resume: goes on with an interrupted session.
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Resume final : public LinkVerb {
 public:
  const char* name() const override { return "resume"; }
  const char* about() const override {
    return "Go on with an interrupted session, from its last finished walk.";
  }
  const char* group() const override { return "In a session"; }
  std::vector<std::string> examples() const override { return {"pastern resume", "pastern resume --json"}; }

 protected:
  void more_options(Options& options) override {
    options.flag("--json", choice_.json, "Each message of the robot as one line of JSON")
        .flag("--quiet", choice_.quiet, "The verdict only")
        .flag("--brief", choice_.brief, "Progress, without a line a walk");
  }
  Exit run_on(RobotLine& line) override {
    Exit exit = line.hold_baton();
    if (exit != Exit::done) return exit;
    v1::Status status;
    exit = line.status(status);
    if (exit != Exit::done) return exit;
    const v1::SessionPart part = status.session_part();
    // A session whose ground tool has gone waits for the baton: taking it up again is all that it needs.
    const bool running = part == v1::IN_BASELINE || part == v1::IN_SEARCH || part == v1::IN_CONFIRMATION;
    v1::Answer answer;
    if (!running) exit = line.ask(command_of(&v1::Command::mutable_resume), answer);
    if (exit != Exit::done) return exit;
    if (!choice_.json && !choice_.quiet)
      say(!running              ? answer.words()
          : line.baton_shared() ? "the session is under way; another pastern on this computer holds its baton"
                                : "the session is under way; its baton is held here");
    choice_.commander = !line.baton_shared();
    choice_.session = status.session();
    choice_.resumed = !running;
    return follow(line, choice_);
  }

 private:
  FollowChoice choice_;
};

}  // namespace

std::unique_ptr<Verb> make_resume() { return std::make_unique<Resume>(); }

}  // namespace pastern::tools
