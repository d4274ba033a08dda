// confirm: the first start with a robot file that this robot's journal has not seen.
#include <fmt/format.h>

#include <iostream>

#include "proto/files/robot_file.h"
#include "proto/files/text.h"
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

constexpr const char* kProcedure =
    "First start with a robot file. Pastern is not a certified safety function; local rules and the maker's\n"
    "instructions come first, and a person who is licensed to do this work decides.\n"
    "\n"
    "Before you confirm (nothing moves until then):\n"
    " 1. Hang the robot on a gantry, feet clear of the ground. Nobody in reach of the legs, loose things "
    "away.\n"
    " 2. One person holds the emergency stop and does nothing else. Press it once before any torque:\n"
    "    `pastern status` must name emergency_stop. Turn it back, then `pastern release`.\n"
    " 3. Begin with low limits: a copy of the robot file with peak_torque_nm, slew_nm_per_s and\n"
    "    speed_max_rad_per_s of every joint at a fifth or less.\n"
    " 4. Signs, one joint at a time, with the drives' own tool, the others without torque: turn the joint "
    "by\n"
    "    hand and compare the sign of its angle with the robot file's axis; then a small torque, and see "
    "that\n"
    "    it turns the same way. A wrong sign runs away: low limits and the hand on the emergency stop are\n"
    "    what holds it.\n"
    " 5. Compare stance_rad and lying_rad with the robot's own poses, joint by joint.\n"
    "Once confirmed, still hanging:\n"
    " 6. See both stops work: `pastern walk`, and within it `pastern stop`; again with `pastern halt`; "
    "again\n"
    "    with the link unplugged; again with the drives' bus cable pulled: they must damp by themselves\n"
    "    within drive_timeout_s, be without torque half a second later, and stay so until released.\n"
    " 7. Raise the limits in steps. A changed robot file is another file: it is confirmed anew.\n"
    " 8. Only then the floor: slack rope, lane clear, a short walk (`pastern walk --seconds 1`).\n";

class Confirm final : public LinkVerb {
 public:
  const char* name() const override { return "confirm"; }
  const char* about() const override {
    return "Read the first-start procedure and confirm it for the robot's file.";
  }
  const char* group() const override { return "Before the first walk"; }
  std::vector<std::string> examples() const override {
    return {"pastern confirm my.robot.txtpb",
            "pastern confirm --yes-i-have-read hal_stub/robots/dunlin12.robot.txtpb",
            "pastern confirm --show", "",
            "With the robot file named, its hash is compared with the one that the robot runs."};
  }

 protected:
  void more_options(Options& options) override {
    options.text("robot-file", file_, "The robot file that you have read")
        .flag("--yes-i-have-read", yes_, "For scripts: no question is asked")
        .flag("--show", show_, "Print the procedure, confirm nothing");
  }
  Exit before() override;
  Exit run_on(RobotLine& line) override;

 private:
  [[nodiscard]] bool person_agrees(const std::string& robot, const std::string& hash) const;

  std::string file_;
  std::string hash_;
  bool yes_{false};
  bool show_{false};
};

Exit Confirm::before() {
  if (file_.empty()) return Exit::done;
  files::Defects defects;
  const auto robot = files::read_robot(file_, defects);
  for (const files::Defect& defect : defects) complain(defect.line());
  if (!robot) return Exit::file_wrong;
  hash_ = files::hex(robot->sha256());
  return Exit::done;
}

/// With the file named the hashes were compared by us; without, the person shows that they have looked it up.
bool Confirm::person_agrees(const std::string& robot, const std::string& hash) const {
  const std::string wanted = hash_.empty() ? hash.substr(0, 8) : "yes";
  std::cout << (hash_.empty()
                    ? fmt::format("Type the first 8 digits of `sha256sum` of the robot file of {}: ", robot)
                    : fmt::format("{} runs this very file ({}). Type yes when steps 1 to 5 are done: ", robot,
                                  brief_hash(hash)))
            << std::flush;
  std::string typed;
  return static_cast<bool>(std::getline(std::cin, typed)) && typed == wanted;
}

Exit Confirm::run_on(RobotLine& line) {
  if (show_) {
    say(kProcedure);
    suggest("confirm my.robot.txtpb", "when steps 1 to 5 are done");
    return Exit::done;
  }
  v1::Status status;
  Exit exit = line.status(status);
  if (exit != Exit::done) return exit;
  if (!hash_.empty() && hash_ != status.robot_sha256_hex()) {
    complain(fmt::format("pastern confirm: {}: found sha256 {}, expected {}, the file that the robot runs",
                         file_, brief_hash(hash_), brief_hash(status.robot_sha256_hex())));
    return Exit::file_wrong;
  }
  if (!yes_ && !can_ask()) {
    complain("pastern confirm: no terminal to ask at: expected --yes-i-have-read");
    return Exit::usage;
  }
  say(kProcedure);
  if (!yes_ && !person_agrees(status.robot(), status.robot_sha256_hex())) {
    complain("pastern confirm: not confirmed; nothing was sent");
    return Exit::refused;
  }
  v1::Command command = command_of(&v1::Command::mutable_confirm_first_start);
  command.mutable_confirm_first_start()->set_robot_sha256_hex(status.robot_sha256_hex());
  command.mutable_confirm_first_start()->set_who(reach_.name);
  command.mutable_confirm_first_start()->set_read_procedure(true);
  exit = line.hold_baton();
  if (exit != Exit::done) return exit;
  v1::Answer answer;
  exit = line.ask(command, answer);
  if (exit != Exit::done) return exit;
  say(answer.words().empty() ? "confirmed: written to the robot's journal" : answer.words());
  suggest("walk --seconds 1", "still hanging: step 6; a session comes last");
  return Exit::done;
}

}  // namespace

std::unique_ptr<Verb> make_confirm() { return std::make_unique<Confirm>(); }

}  // namespace pastern::tools
