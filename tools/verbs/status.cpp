// status: what the robot says of itself.
#include "tools/pastern/json.h"
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class StatusVerb final : public LinkVerb {
 public:
  const char* name() const override { return "status"; }
  const char* about() const override { return "What the robot does, holds and waits for."; }
  const char* group() const override { return "On the robot"; }
  std::vector<std::string> examples() const override {
    return {"pastern status", "pastern status --json", "", "Exit status 6 while a trip is latched."};
  }

 protected:
  void more_options(Options& options) override { options.flag("--json", json_, "Print the facts as JSON"); }
  Exit run_on(RobotLine& line) override {
    v1::Status status;
    const Exit exit = line.status(status);
    if (exit != Exit::done) return exit;
    if (json_) {
      say(json(status));
    } else {
      std::string text = status_text(status);
      text.pop_back();
      say(text);
      suggest_after(status);
    }
    return status.robot_state() == v1::TRIPPED ? Exit::tripped : Exit::done;
  }

 private:
  bool json_{false};
};

}  // namespace

std::unique_ptr<Verb> make_status() { return std::make_unique<StatusVerb>(); }

}  // namespace pastern::tools
