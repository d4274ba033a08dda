// See link_verb.h.
#include "tools/pastern/link_verb.h"

#include "tools/pastern/words.h"

namespace pastern::tools {

Exit command_and_suggest(RobotLine& line, const v1::Command& command, const std::string& done) {
  Exit exit = line.hold_baton();
  if (exit != Exit::done) return exit;
  v1::Answer answer;
  exit = line.ask(command, answer);
  if (exit != Exit::done) return exit;
  say(answer.words().empty() ? done : answer.words());
  v1::Status status;
  if (line.status(status) == Exit::done) suggest_after(status);
  return Exit::done;
}

Exit press_and_suggest(RobotLine& line, bool halt, double patience_s) {
  const Exit exit = press(line, halt, patience_s);
  if (exit == Exit::done) {
    suggest("status", "what the robot does now; `pastern release` clears the stop when nobody is in reach");
  } else {
    suggest(halt ? "halt" : "stop --patience 60", "again; the emergency stop comes first");
  }
  return exit;
}

}  // namespace pastern::tools
