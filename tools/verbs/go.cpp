// go: says go for the next walk, at operator pace.
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Go final : public LinkVerb {
 public:
  const char* name() const override { return "go"; }
  const char* about() const override { return "Say go for the next walk, at operator pace."; }
  const char* group() const override { return "In a session"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern go", "pastern go --host 10.0.0.7", "",
        "Only when the robot is back on its mark, and nobody is in reach.",
        "While `pastern start` or `resume` runs on this computer, it shows the walk; otherwise this does."};
  }

 protected:
  Exit run_on(RobotLine& line) override {
    const Exit held = line.hold_baton();
    if (held != Exit::done) return held;
    v1::Status before;
    const Exit asked = line.status(before);
    if (asked != Exit::done) return asked;
    v1::Answer answer;
    const Exit exit = line.ask(command_of(&v1::Command::mutable_go), answer);
    if (exit != Exit::done) return exit;
    say(answer.words().empty() ? "go" : answer.words());
    FollowChoice choice;
    choice.commander = !line.baton_shared();
    choice.session = before.session();
    choice.walks_from = before.walks_done();
    return line.baton_shared() ? Exit::done : follow(line, choice);
  }
};

}  // namespace

std::unique_ptr<Verb> make_go() { return std::make_unique<Go>(); }

}  // namespace pastern::tools
