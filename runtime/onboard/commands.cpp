// What each command does. Every answer is one line that tells what happened and what to do next. Who may
// command has been judged by the link.
#include <cmath>

#include "proto/files/durable.h"
#include "proto/files/plan_file.h"
#include "runtime/onboard/program.h"

namespace pastern::onboard {
namespace {

constexpr double kShortestWalk_s = 0.5;
constexpr double kLongestWalk_s = 60.0;
constexpr const char* kAdoptedFile = "adopted.policy";

v1::Answer accepted(const std::string& words) {
  v1::Answer answer;
  answer.set_accepted(true);
  answer.set_words(words);
  return answer;
}

v1::Answer refused(const std::string& words) {
  v1::Answer answer;
  answer.set_words("refused: " + words);
  return answer;
}

/// SHA-256 in hex of what a command asks for, whoever sends it under whichever baton.
std::string sum_of(v1::Command command) {
  command.clear_id();
  command.clear_baton();
  command.clear_operator_name();
  return files::hex(files::sha256(command.SerializeAsString()));
}

std::string first_line(const files::Defects& defects) {
  if (defects.empty()) return "a file is wrong";
  const std::size_t more = defects.size() - 1;
  return defects.front().line() + (more > 0 ? " (and " + std::to_string(more) + " more)" : "");
}

}  // namespace

// A repeated id of the same key is the same command: it gets the first answer again and nothing is done, also
// after a restart. Another command under the same id is refused, as the link does with what it remembers.
void Program::answer(const Asked& asked, const v1::Command& command) {
  v1::Answer answer;
  const std::string& key = asked.asker.key;
  const std::string sum = sum_of(command);
  const std::optional<journal::CommandRow> before = parts_.journal.command(key, command.id());
  if (before && before->command_sha256_hex != sum) {
    answer = refused("the id was used for another command; a new command needs a new id");
  } else if (before && answer.ParseFromString(before->answer)) {
    answer.set_repeated(true);
  } else {
    answer = act(command, asked);
    answer.set_id(command.id());
    (void)parts_.journal.remember_command({key, command.id(), sum, answer.SerializeAsString()}).ok;
  }
  answer.set_id(command.id());
  show_status(false);  // who asks for the status after this answer sees what the command did
  server_->answer(asked.ticket, answer);
}

v1::Answer Program::act(const v1::Command& command, const Asked& asked) {
  const std::string& who = asked.asker.who;
  switch (command.what_case()) {
    case v1::Command::kStartSession:
      return start_session(command.start_session(), who);
    case v1::Command::kGo:
      return go();
    case v1::Command::kWalk:
      return walk(command.walk());
    case v1::Command::kMarkVoid:
      return mark_void(command.mark_void());
    case v1::Command::kRelease:
      return release(asked.stops_seen);
    case v1::Command::kResume:
      return resume();
    case v1::Command::kPark:
      return park();
    case v1::Command::kAdopt:
      return adopt(command.adopt(), who);
    case v1::Command::kConfirmFirstStart:
      return confirm(command.confirm_first_start(), who);
    case v1::Command::kEndSession:
      return end_session(who);
    default:
      return refused("this command is not served here; expected one of link.proto's");
  }
}

v1::Answer Program::start_session(const v1::StartSession& start, const std::string& who) {
  if (runner_.in_session() || busy())
    return refused("the robot is busy; wait, or leave the session (pastern park)");
  files::Defects defects;
  const std::optional<v1::Plan> plan = files::parse_plan(start.plan_text(), "plan", defects);
  if (!plan) return refused(first_line(defects));
  session::SessionSetup setup{*plan, start.plan_text(), parts_.policy, std::nullopt};
  if (!start.candidate_policy().empty()) {
    setup.candidate =
        files::parse_policy(start.candidate_policy(), "candidate policy", parts_.robot, defects);
    if (!setup.candidate) return refused(first_line(defects));
  }
  const std::string why = runner_.refusal_of(setup);
  if (!why.empty()) return refused(why);
  if (runner_.interrupted_session() != 0) {
    const journal::Written ended =
        runner_.end_interrupted("keep the start policy: another session was started instead");
    if (!ended.ok) return refused(ended.words);
  }
  job_.kind = Job::Kind::session;
  job_.setup = std::move(setup);
  job_.who = who;
  const bool by_go = plan->go_by() != v1::Plan::AUTO || !parts_.mover.simulated();
  return accepted("session begins, plan " + plan->name() +
                  (by_go ? "; each walk waits for go (pastern go)" : "; it walks by itself (pastern watch)"));
}

v1::Answer Program::go() {
  if (runner_.waiting_for() != "go") {
    const std::string waits = runner_.waiting_for().empty() ? "nothing" : runner_.waiting_for();
    return refused("no walk waits for go; the robot waits for " + waits + " (pastern status)");
  }
  runner_.go();
  return accepted("the next walk begins; keep clear of the lane");
}

v1::Answer Program::walk(const v1::Walk& walk) {
  if (runner_.in_session()) return refused("a session is running; its walks come by themselves or by go");
  if (busy()) return refused("the robot is busy; wait for the walk to end");
  const std::string missing = runner_.first_start_missing();
  if (!missing.empty()) return refused(missing);
  if (!parts_.journal.failure().empty())
    return refused(parts_.journal.failure() + "; no walk without a record");
  if (!(walk.duration_s() >= kShortestWalk_s && walk.duration_s() <= kLongestWalk_s)) {
    return refused("duration: found " + std::to_string(walk.duration_s()) + " s, expected 0.5 to 60 s");
  }
  if (parts_.mover.report().phase != safety::Phase::armed) {
    return refused("tripped; remove the cause and release first (pastern release)");
  }
  job_.kind = Job::Kind::walk;
  job_.duration_s = walk.duration_s();
  job_.draw = walk.draw();
  return accepted("one walk begins; keep clear of the lane");
}

v1::Answer Program::mark_void(const v1::MarkVoid& mark) {
  std::string words;
  return runner_.mark_void(mark.walk(), mark.reason(), words) ? accepted(words) : refused(words);
}

v1::Answer Program::release(std::uint64_t stops_seen) {
  std::string words;
  return runner_.release(words, stops_seen) ? accepted(words) : refused(words);
}

v1::Answer Program::resume() {
  if (runner_.in_session() || busy()) return refused("a session is running already");
  if (runner_.interrupted_session() == 0) return refused("no interrupted session; start one (pastern start)");
  const std::string missing = runner_.first_start_missing();
  if (!missing.empty()) return refused(missing);
  if (!parts_.journal.failure().empty())
    return refused(parts_.journal.failure() + "; no walk without a record");
  job_.kind = Job::Kind::resume;
  return accepted("session " + std::to_string(runner_.interrupted_session()) + " goes on (pastern watch)");
}

v1::Answer Program::park() {
  runner_.pause();
  if (!runner_.in_session()) return accepted("the robot is parked, or will be when its walk ends");
  return accepted(
      "the robot parks, after its walk if it is in one, and the session is left; go on with it later "
      "(pastern resume)");
}

// Empty sha: what the last verdict proposes.
std::optional<std::string> Program::proposed_sha(std::string& words) const {
  const std::optional<journal::SessionRow> row = parts_.journal.last_session();
  const std::optional<v1::Verdict> verdict = row ? parts_.journal.verdict(row->session) : std::nullopt;
  if (!verdict) {
    words = "no verdict yet; name the policy by its sha256, or run a session first";
  } else if (verdict->kind() != v1::Verdict::ADOPT) {
    words = "the last verdict says keep; name a policy by its sha256 to adopt it all the same";
  } else {
    return files::hex(verdict->adapted_sha256());
  }
  return std::nullopt;
}

v1::Answer Program::adopt(const v1::Adopt& adopt, const std::string& who) {
  if (runner_.in_session() || busy()) return refused("the robot is busy; adopt when the session has ended");
  std::string words;
  const std::optional<std::string> sha =
      adopt.policy_sha256().empty() ? proposed_sha(words) : files::hex(adopt.policy_sha256());
  if (!sha) return refused(words);
  const bool adopted_before = !parts_.journal.adoptions().empty();
  if (adopted_before && *sha == files::hex(parts_.policy.sha256()))
    return accepted("policy " + *sha + " is current already; nothing was changed");
  const std::optional<std::string> bytes = parts_.journal.policy(*sha);
  if (!bytes) return refused("no policy with sha256 " + *sha + " in the journal");
  files::Defects defects;
  std::optional<files::PolicyFile> policy =
      files::parse_policy(*bytes, "policy " + *sha, parts_.robot, defects);
  const std::string path = parts_.journal_folder + "/" + kAdoptedFile;
  if (!policy || !files::write_durably(path, *bytes, 0644, defects)) return refused(first_line(defects));
  // The history begins with the policy that the program was started with: the way back leads there.
  journal::Written written{true, ""};
  if (!adopted_before) {
    const std::string first = files::hex(parts_.policy.sha256());
    written = parts_.journal.adopt({first, who, now_utc(), "was current before the first adoption"});
  }
  if (!written.ok) return refused(written.words);
  const char* why = adopt.policy_sha256().empty() ? "as the last verdict proposes"
                    : adopt.back()                ? journal::kWentBack
                                                  : "named by the operator";
  written = parts_.journal.adopt({*sha, who, now_utc(), why});
  if (!written.ok) return refused(written.words);
  parts_.policy = std::move(*policy);
  on_note("policy " + *sha + " adopted by " + who);
  return accepted("policy " + *sha + " is current; it is also in " + path);
}

v1::Answer Program::confirm(const v1::ConfirmFirstStart& confirm, const std::string& who) {
  const std::string found = files::hex(parts_.robot.sha256());
  if (confirm.robot_sha256_hex() != found) {
    return refused("robot file's sha256: found \"" + confirm.robot_sha256_hex() + "\", expected " + found);
  }
  if (!confirm.read_procedure()) {
    return refused(
        "read the first-start procedure (gantry, low limits, hand on the emergency stop, signs one "
        "joint at a time) and say so");
  }
  const std::string name = confirm.who().empty() ? who : confirm.who();
  const journal::Written written = parts_.journal.confirm_first_start({found, name, now_utc()});
  if (!written.ok) return refused(written.words);
  on_note("first start with robot file " + found + " confirmed by " + name);
  return accepted("first start confirmed by " + name + "; the robot may walk (pastern walk)");
}

v1::Answer Program::end_session(const std::string& who) {
  if (runner_.in_session()) {
    runner_.end();
    return accepted("the session ends as keep when the robot is parked");
  }
  if (busy() || runner_.interrupted_session() == 0) return refused("no session to end");
  const std::uint64_t number = runner_.interrupted_session();
  const journal::Written written =
      runner_.end_interrupted("keep the start policy: ended by " + who + " before a verdict");
  return written.ok ? accepted("session " + std::to_string(number) + " has ended as keep")
                    : refused(written.words);
}

}  // namespace pastern::onboard
