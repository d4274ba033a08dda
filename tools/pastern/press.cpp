// Stop and halt: tried first, retried, and said in words whether the robot confirmed. See follow.h.
#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <thread>

#include "tools/pastern/follow.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

using Clock = std::chrono::steady_clock;

constexpr const char* kByHand = "Use the emergency stop in your hand.";

std::string confirmed_words(bool halt) {
  return halt ? "halt: CONFIRMED by the robot: torque is off."
              : "stop: CONFIRMED by the robot: it damps, lowers itself, then torque off; without torque it "
                "stays so.";
}

}  // namespace

Exit press(RobotLine& line, bool halt, double patience_s) {
  const char* name = halt ? "halt" : "stop";
  const auto begun = Clock::now();
  int tries = 0;
  bool received = false;
  const auto left = [&] { return patience_s - std::chrono::duration<double>(Clock::now() - begun).count(); };
  while (left() > 0.05) {
    // A new id each time: a repeated one would be given the first answer again.
    const v1::Command command =
        halt ? command_of(&v1::Command::mutable_halt) : command_of(&v1::Command::mutable_stop);
    const auto answer = line.ask_quietly(command, std::clamp(left(), 0.05, 1.0));
    ++tries;
    if (answer && !answer->accepted()) {
      const std::string& words = answer->words();
      const std::string said = words.rfind("refused: ", 0) == 0 ? words.substr(9) : words;
      complain(fmt::format("{}: REFUSED by the robot: {}. {}", name, said, kByHand));
      return Exit::refused;
    }
    if (answer && answer->confirmed()) {
      say(confirmed_words(halt));
      return Exit::done;
    }
    received = received || answer.has_value();
    if (!answer && tries == 1) complain(fmt::format("{}: no answer yet, trying again. {}", name, kByHand));
    if (answer) std::this_thread::sleep_for(std::chrono::milliseconds(20));
  }
  if (received) {
    complain(fmt::format("{}: RECEIVED by the robot but NOT CONFIRMED within {:g} s. {}", name, patience_s,
                         kByHand));
  } else {
    complain(fmt::format(
        "{}: NOT CONFIRMED: no answer from {} within {:g} s ({} tries). The robot may still be moving. {}",
        name, line.reach().endpoint(), patience_s, tries, kByHand));
  }
  return Exit::not_reached;
}

}  // namespace pastern::tools
