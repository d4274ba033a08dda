// stop: the controlled stop. No baton is needed.
#include "tools/pastern/link_verb.h"

namespace pastern::tools {
namespace {

class Stop final : public LinkVerb {
 public:
  const char* name() const override { return "stop"; }
  const char* about() const override {
    return "Controlled stop: damp, lower, torque off. Tried again until the robot confirms.";
  }
  const char* group() const override { return "In a hurry"; }
  std::vector<std::string> examples() const override {
    return {"pastern stop", "pastern stop --patience 30 --host 10.0.0.7", "",
            "Exit status 0 only when the robot confirmed; 4 when it did not answer or did not confirm.",
            "It does not replace the emergency stop in your hand."};
  }

 protected:
  void more_options(Options& options) override {
    options.number("--patience", patience_s_, "Seconds to go on trying", 0.2, 3600);
  }
  Exit run_on(RobotLine& line) override { return press_and_suggest(line, false, patience_s_); }

 private:
  double patience_s_{5};
};

}  // namespace

std::unique_ptr<Verb> make_stop() { return std::make_unique<Stop>(); }

}  // namespace pastern::tools
