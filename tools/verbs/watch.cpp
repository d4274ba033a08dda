// watch: follows what the robot does, without commanding.
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Watch final : public LinkVerb {
 public:
  const char* name() const override { return "watch"; }
  const char* about() const override {
    return "Follow the session: one line a walk, progress, estimated end.";
  }
  const char* group() const override { return "In a session"; }
  std::vector<std::string> examples() const override {
    return {"pastern watch", "pastern watch --json > session.jsonl", "pastern watch --on", "",
            "Needs no baton. Ends with the session; with --on it waits for the next one. Ctrl-C ends the "
            "watching only."};
  }

 protected:
  void more_options(Options& options) override {
    options.flag("--json", choice_.json, "Each message of the robot as one line of JSON")
        .flag("--on", choice_.forever, "Do not end with the session");
  }
  Exit run_on(RobotLine& line) override {
    v1::Status status;
    const Exit exit = line.status(status);
    if (exit != Exit::done) return exit;
    const bool idle = status.session_part() == v1::NO_SESSION || status.session_part() == v1::ENDED ||
                      status.session_part() == v1::INTERRUPTED;
    if (idle && !choice_.forever) {
      if (!choice_.json) say("no session is under way (session: " + words(status.session_part()) + ")");
      if (!choice_.json) suggest_after(status);
      return Exit::done;
    }
    return follow(line, choice_);
  }

 private:
  FollowChoice choice_;
};

}  // namespace

std::unique_ptr<Verb> make_watch() { return std::make_unique<Watch>(); }

}  // namespace pastern::tools
