// park: lowers the robot and takes the torque off.
#include "tools/pastern/link_verb.h"

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
    return command_and_suggest(line, command_of(&v1::Command::mutable_park), "parking");
  }
};

}  // namespace

std::unique_ptr<Verb> make_park() { return std::make_unique<Park>(); }

}  // namespace pastern::tools
