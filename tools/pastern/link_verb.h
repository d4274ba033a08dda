// What the verbs that talk to the robot have in common.
#pragma once

#include "tools/pastern/follow.h"
#include "tools/pastern/reach.h"
#include "tools/pastern/verb.h"

namespace pastern::tools {

/// Declares the way to the robot, opens it, and hands it on.
class LinkVerb : public Verb {
 public:
  void options(Options& options) final {
    more_options(options);
    reach_.options(options);
  }
  Exit run() final {
    Exit exit = before();
    if (exit != Exit::done) return exit;
    const auto line = RobotLine::open(reach_, name(), exit);
    return line ? run_on(*line) : exit;
  }

 protected:
  virtual void more_options(Options&) {}
  /// What can be judged before the robot is spoken to (files); Exit::done to go on.
  virtual Exit before() { return Exit::done; }
  virtual Exit run_on(RobotLine& line) = 0;

  Reach reach_;
};

/// Holds the baton, sends one command, says what the robot answered, and suggests what comes next.
[[nodiscard]] Exit command_and_suggest(RobotLine& line, const v1::Command& command, const std::string& done);

/// Stop or halt with its own words, then what comes next.
[[nodiscard]] Exit press_and_suggest(RobotLine& line, bool halt, double patience_s);

}  // namespace pastern::tools
