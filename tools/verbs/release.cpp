// release: clears a latched trip; the operator's act.
#include "tools/pastern/link_verb.h"

namespace pastern::tools {
namespace {

class Release final : public LinkVerb {
 public:
  const char* name() const override { return "release"; }
  const char* about() const override { return "Clear a latched trip, once its cause is gone."; }
  const char* group() const override { return "On the robot"; }
  std::vector<std::string> examples() const override {
    return {"pastern release", "",
            "A release never moves the robot: the torque stays off until the next order."};
  }

 protected:
  Exit run_on(RobotLine& line) override {
    return command_and_suggest(line, command_of(&v1::Command::mutable_release),
                               "released: torque is off, nothing moves");
  }
};

}  // namespace

std::unique_ptr<Verb> make_release() { return std::make_unique<Release>(); }

}  // namespace pastern::tools
