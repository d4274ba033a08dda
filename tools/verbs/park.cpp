// park: lowers the robot and takes the torque off.
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Park final : public LinkVerb {
 public:
  const char* name() const override { return "park"; }
  const char* about() const override { return "Lower the robot, then torque off; a session waits."; }
  const char* group() const override { return "On the robot"; }
  std::vector<std::string> examples() const override {
    return {"pastern park", "", "Parks between walks. To stop a walk that is under way: pastern stop."};
  }

 protected:
  Exit run_on(RobotLine& line) override {
    Exit exit = line.hold_baton();
    if (exit != Exit::done) return exit;
    v1::Status status;
    exit = line.status(status);
    if (exit != Exit::done) return exit;
    v1::Answer answer;
    exit = line.ask(command_of(&v1::Command::mutable_park), answer);
    if (exit != Exit::done) return exit;
    say(answer.words().empty() ? "parking" : answer.words());
    const v1::SessionPart part = status.session_part();
    const bool running = part == v1::IN_BASELINE || part == v1::IN_SEARCH || part == v1::IN_CONFIRMATION;
    if (running) {
      suggest("resume", "goes on with the session, when it is time");
    } else {
      suggest_after(status);
    }
    return Exit::done;
  }
};

}  // namespace

std::unique_ptr<Verb> make_park() { return std::make_unique<Park>(); }

}  // namespace pastern::tools
