// release: clears a latched trip; the operator's act.
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Release final : public LinkVerb {
 public:
  const char* name() const override { return "release"; }
  const char* about() const override { return "Clear a latched trip, once its cause is gone."; }
  const char* group() const override { return "On the robot"; }
  std::vector<std::string> examples() const override {
    return {"pastern release", "",
            "Outside a session a release moves nothing. A session that waits for it goes on, under the baton "
            "held here."};
  }

 protected:
  Exit run_on(RobotLine& line) override {
    Exit exit = line.hold_baton();
    if (exit != Exit::done) return exit;
    v1::Answer answer;
    exit = line.ask(command_of(&v1::Command::mutable_release), answer);
    if (exit != Exit::done) return exit;
    say(answer.words().empty() ? "released: nothing moves by itself" : answer.words());
    v1::Status status;
    exit = line.status(status);
    if (exit != Exit::done) return exit;
    const v1::SessionPart part = status.session_part();
    const bool running = part == v1::IN_BASELINE || part == v1::IN_SEARCH || part == v1::IN_CONFIRMATION;
    if (running && !line.baton_shared()) {
      // The session goes on under the baton that this process holds.
      FollowChoice choice;
      choice.commander = true;
      choice.session = status.session();
      return follow(line, choice);
    }
    suggest_after(status);
    return Exit::done;
  }
};

}  // namespace

std::unique_ptr<Verb> make_release() { return std::make_unique<Release>(); }

}  // namespace pastern::tools
