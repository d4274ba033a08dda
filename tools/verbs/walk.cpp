// walk: one walk of the current policy outside a session, recorded.
#include "tools/pastern/link_verb.h"

namespace pastern::tools {
namespace {

class Walk final : public LinkVerb {
 public:
  const char* name() const override { return "walk"; }
  const char* about() const override {
    return "One walk of the current policy, outside a session; recorded.";
  }
  const char* group() const override { return "On the robot"; }
  std::vector<std::string> examples() const override {
    return {"pastern walk", "pastern walk --seconds 2 --draw 7", "",
            "The robot rises, walks, settles, lowers itself, torque off. Lane clear, emergency stop in your "
            "hand."};
  }

 protected:
  void more_options(Options& options) override {
    options.number("--seconds", seconds_, "How long it walks", 0.5, 60)
        .whole("--draw", draw_, "Random stream of the walk", 0, ~0ULL)
        .flag("--json", choice_.json, "Each message of the robot as one line of JSON");
  }
  Exit run_on(RobotLine& line) override {
    Exit exit = line.hold_baton();
    if (exit != Exit::done) return exit;
    v1::Command command = command_of(&v1::Command::mutable_walk);
    command.mutable_walk()->set_duration_s(seconds_);
    command.mutable_walk()->set_draw(draw_);
    v1::Answer answer;
    exit = line.ask(command, answer);
    if (exit != Exit::done) return exit;
    choice_.commander = true;
    choice_.single = true;
    return follow(line, choice_);
  }

 private:
  double seconds_{5};
  std::uint64_t draw_{0};
  FollowChoice choice_;
};

}  // namespace

std::unique_ptr<Verb> make_walk() { return std::make_unique<Walk>(); }

}  // namespace pastern::tools
