// The loop that follows a session, and the two ways to stop it. See follow.h.
#include "tools/pastern/follow.h"

#include <fmt/format.h>
#include <poll.h>
#include <unistd.h>

#include <csignal>
#include <iostream>

#include "tools/pastern/json.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

volatile std::sig_atomic_t interrupts = 0;
void count_interrupt(int) { interrupts = interrupts + 1; }

/// Ctrl-C is counted while this lives.
class Interrupts {
 public:
  Interrupts() {
    interrupts = 0;
    struct sigaction action {};
    action.sa_handler = count_interrupt;
    sigaction(SIGINT, &action, &before_);
  }
  ~Interrupts() { sigaction(SIGINT, &before_, nullptr); }
  Interrupts(const Interrupts&) = delete;
  Interrupts& operator=(const Interrupts&) = delete;

 private:
  struct sigaction before_ {};
};

std::optional<std::string> typed_line() {
  pollfd input{STDIN_FILENO, POLLIN, 0};
  std::string line;
  if (poll(&input, 1, 0) != 1 || !std::getline(std::cin, line)) return std::nullopt;
  return line;
}

/// Traces are for pictures; they would make a line of JSON a thousand numbers long.
v1::Telemetry without_trace(v1::Telemetry telemetry) {
  if (telemetry.has_episode()) telemetry.mutable_episode()->clear_trace();
  return telemetry;
}

class Follower {
 public:
  Follower(RobotLine& line, const FollowChoice& choice) : line_(line), choice_(choice) {}
  Exit run();

 private:
  void take(const v1::Telemetry& telemetry);
  void take(const v1::Episode& episode);
  void notice(const v1::Status& status);
  void look();
  void obey(const std::string& typed);
  void send(const v1::Command& command, const std::string& done);
  void show_progress();
  void wipe_progress();
  void prompt();
  void look_at_once();
  void keep_baton();
  [[nodiscard]] bool ours() const;
  [[nodiscard]] bool waits_for_person() const;
  [[nodiscard]] std::optional<Exit> ended() const;
  [[nodiscard]] std::optional<Exit> tripped() const;
  [[nodiscard]] Exit close(Exit exit);

  RobotLine& line_;
  FollowChoice choice_;
  Progress progress_;
  v1::Status status_;
  std::optional<v1::Verdict> verdict_;
  std::chrono::steady_clock::time_point last_word_{std::chrono::steady_clock::now()};
  bool seen_{false};  ///< the session, or the single walk, has been seen under way
  bool settled_{
      false};  ///< status_ is not ahead of the walks that were told: it came in their order, or none is left
  bool head_said_{false};
  bool progress_shown_{false};
  bool single_done_{false};
  bool silent_{false};
  bool introduced_{false};
  std::optional<std::chrono::steady_clock::time_point>
      baton_wanted_;      ///< since when the session waits for it
  std::string prompted_;  ///< what was last asked for
};

void Follower::wipe_progress() {
  if (!progress_shown_) return;
  std::cout << "\r\033[K" << std::flush;
  progress_shown_ = false;
}

void Follower::show_progress() {
  if (!at_terminal() || choice_.json || choice_.single || status_.walks_planned() == 0) return;
  wipe_progress();
  const std::string waiting = status_.waiting_for().empty() ? "" : ", waiting for " + status_.waiting_for();
  std::cout << progress_.line() << waiting << std::flush;
  progress_shown_ = true;
}

void Follower::take(const v1::Episode& episode) {
  const bool ours = episode.session() != 0 && episode.session() >= choice_.session;
  seen_ = seen_ || ours;
  if (ours) progress_.update(episode.walk(), status_.walks_planned(), last_word_, waits_for_person());
  single_done_ = single_done_ || episode.part() == v1::SINGLE;
  if (choice_.json || choice_.quiet) return;
  const bool tenth = !at_terminal() && !choice_.single && episode.walk() % 10 == 0;
  if (!choice_.brief) {
    if (!head_said_) say(walk_head());
    head_said_ = true;
    say(walk_line(episode));
  }
  if (tenth)
    say(fmt::format("{}{}, return {:.2f}", choice_.brief ? "" : "      ", progress_.line(),
                    episode.terms().total()));
}

void Follower::take(const v1::Telemetry& telemetry) {
  last_word_ = std::chrono::steady_clock::now();
  wipe_progress();
  if (choice_.json) say(json(without_trace(telemetry)));
  switch (telemetry.what_case()) {
    case v1::Telemetry::kStatus:
      notice(telemetry.status());
      settled_ = true;
      break;
    case v1::Telemetry::kEpisode:
      take(telemetry.episode());
      break;
    case v1::Telemetry::kVerdict:
      if (!choice_.single) verdict_ = telemetry.verdict();
      break;
    case v1::Telemetry::kNote:
      if (!choice_.json && !choice_.quiet && !choice_.brief) say("      " + telemetry.note());
      break;
    case v1::Telemetry::WHAT_NOT_SET:
      break;
  }
}

/// Asks when telemetry has been silent for a second: at stepped pace nothing is published between orders.
void Follower::look() {
  if (std::chrono::steady_clock::now() - last_word_ < std::chrono::seconds(1)) return;
  look_at_once();
  settled_ = !silent_;
}

void Follower::look_at_once() {
  last_word_ = std::chrono::steady_clock::now();
  const auto answer = line_.ask_quietly(command_of(&v1::Command::mutable_ask_status), 1.0);
  if (!answer && !silent_) complain(fmt::format("no answer from {}; still trying", line_.reach().endpoint()));
  if (answer && silent_) complain(fmt::format("{} answers again", line_.reach().endpoint()));
  silent_ = !answer.has_value();
  if (answer) notice(answer->status());
}

void Follower::notice(const v1::Status& status) {
  status_ = status;
  const v1::SessionPart part = status_.session_part();
  const bool running = part == v1::IN_BASELINE || part == v1::IN_SEARCH || part == v1::IN_CONFIRMATION;
  if (ours() && (running || (choice_.resumed && part == v1::ENDED))) seen_ = true;
  if (!seen_ || choice_.single) return;
  progress_.update(status_.walks_done(), status_.walks_planned(), last_word_, waits_for_person());
  if (introduced_ || choice_.json || choice_.quiet || !running) return;
  introduced_ = true;
  say(fmt::format("session {} on {} ({}, {} pace), {} walks planned at the most", status_.session(),
                  status_.robot(),
                  drives_words(status_.simulated(), status_.drives(), status_.drives_settings()),
                  status_.pace(), status_.walks_planned()));
}

/// The session to follow, and not one before it that the robot still tells of.
bool Follower::ours() const { return status_.session() != 0 && status_.session() >= choice_.session; }

/// Not for heat or pack: those pass by themselves and belong to the pace.
bool Follower::waits_for_person() const {
  const std::string& waits = status_.waiting_for();
  return waits == "go" || waits == "release" || waits == "baton";
}

/// A baton that lapsed (this computer or the way to the robot was too slow) is taken up again. At wall pace
/// the robot has tripped for it and moves no more before a person releases it.
void Follower::keep_baton() {
  const auto now = std::chrono::steady_clock::now();
  if (!ours() || status_.waiting_for() != "baton")
    baton_wanted_.reset();
  else if (!baton_wanted_)
    baton_wanted_ = now;
  // A status may be older than the baton that is held here.
  const bool wanted = baton_wanted_ && now - *baton_wanted_ > std::chrono::milliseconds(500);
  const bool lapsed = line_.client().baton() == 0 || wanted;
  if (!choice_.commander || line_.baton_shared() || !lapsed) return;
  wipe_progress();
  complain("the baton had lapsed: no sign of life reached the robot in time; taking it up again");
  (void)line_.hold_baton();
  look_at_once();
}

/// What the robot waits for a person to do, said once each time.
void Follower::prompt() {
  const std::string waits = !seen_ || !ours() ? "" : status_.waiting_for();
  const std::string about = waits + fmt::format(" {}", status_.walks_done());
  if ((waits != "go" && waits != "release") || about == prompted_) {
    if (waits != "go" && waits != "release") prompted_.clear();
    return;
  }
  prompted_ = about;
  wipe_progress();
  if (choice_.json) return;
  if (waits == "release") say("tripped: " + trip_words(status_.trip()));
  const std::uint64_t next = status_.walks_done() + 1;
  if (!choice_.commander || !can_ask()) {
    const bool go = waits == "go";
    suggest(waits, go ? fmt::format("walk {} waits for it", next) : "the session waits for it");
  } else if (waits == "go") {
    say(fmt::format("walk {}: Enter = go; v = the last walk is void; e = end the session; s = stop", next));
  } else {
    say("when its cause is gone and nobody is in reach: r = release, and the session goes on; e = end the "
        "session");
  }
}

void Follower::send(const v1::Command& command, const std::string& done) {
  v1::Answer answer;
  const bool accepted = line_.ask(command, answer) == Exit::done;
  if (accepted) say("      " + (answer.words().empty() ? done : answer.words()));
  // Asked for again when it was refused or a walk was taken back. After a go nobody must be asked for one
  // until the walk is over: the status may lag, and the lane is no longer safe.
  if (!accepted || command.has_mark_void()) prompted_.clear();
}

void Follower::obey(const std::string& typed) {
  if (typed == "s") {
    (void)press(line_, false, 5);
  } else if (typed == "e") {
    send(command_of(&v1::Command::mutable_end_session), "the session ends");
  } else if (!typed.empty() && typed[0] == 'v') {
    v1::Command command = command_of(&v1::Command::mutable_mark_void);
    command.mutable_mark_void()->set_walk(status_.walks_done());
    command.mutable_mark_void()->set_reason(typed.size() > 2 ? typed.substr(2) : "marked by the operator");
    send(command, "marked void");
  } else if (typed == "r") {
    send(command_of(&v1::Command::mutable_release), "released");
  } else if (typed.empty() && status_.waiting_for() == "go") {
    send(command_of(&v1::Command::mutable_go), "go");
  }
}

/// Empty while there is something to follow.
std::optional<Exit> Follower::ended() const {
  if (choice_.forever) return std::nullopt;
  if (choice_.single) return single_done_ ? std::optional(Exit::done) : tripped();
  if (!seen_) return std::nullopt;
  if (choice_.walks_from && ours() && status_.walks_done() > *choice_.walks_from) return Exit::done;
  if (verdict_) return verdict_->kind() == v1::Verdict::ADOPT ? Exit::done : Exit::findings;
  if (!ours() || !settled_) return std::nullopt;
  if (status_.session_part() == v1::ENDED) {
    return status_.verdict().kind() == v1::Verdict::ADOPT ? Exit::done : Exit::findings;
  }
  if (status_.session_part() == v1::INTERRUPTED) return tripped().value_or(Exit::refused);
  // A person at this terminal can release it here; a script is told by the exit status.
  return choice_.commander && !can_ask() ? tripped() : std::nullopt;
}

/// A trip that waits for a person; a fall that the session itself gets up from is none.
std::optional<Exit> Follower::tripped() const {
  const bool latched = status_.robot_state() == v1::TRIPPED && status_.waiting_for() == "release";
  return latched ? std::optional(Exit::tripped) : std::nullopt;
}

Exit Follower::close(Exit exit) {
  wipe_progress();
  v1::Status now;
  if (line_.status(now) == Exit::done) status_ = now;
  if (verdict_) {
    // The robot still lowers itself; its status may lag.
    *status_.mutable_verdict() = *verdict_;
    status_.set_session_part(v1::ENDED);
    status_.clear_waiting_for();
  }
  if (choice_.json) return exit;
  if (!verdict_ && status_.has_verdict() && status_.session_part() == v1::ENDED && !choice_.single) {
    verdict_ = status_.verdict();
  }
  if (exit == Exit::tripped && prompted_.empty()) say("tripped: " + trip_words(status_.trip()));
  if (exit == Exit::refused) say("the session is interrupted; its finished walks are on disk");
  if (verdict_) say(verdict_line(*verdict_));
  const bool told = exit == Exit::tripped && !prompted_.empty();  // the prompt named what to do
  if (!choice_.brief && !told) suggest_after(status_);
  return exit;
}

Exit Follower::run() {
  const Interrupts guard;
  int obeyed = 0;
  look_at_once();
  std::optional<Exit> exit;
  while (!(exit = ended())) {
    if (const auto telemetry = line_.client().next(200)) {
      take(*telemetry);
    } else {
      look();
    }
    keep_baton();
    prompt();
    show_progress();
    if (choice_.commander) {
      if (const auto typed = can_ask() ? typed_line() : std::nullopt) obey(*typed);
    }
    if (interrupts > obeyed) {
      obeyed = interrupts;
      wipe_progress();
      if (!choice_.commander) return Exit::done;
      const Exit stopped = press(line_, obeyed > 1, 5);
      if (stopped != Exit::done || obeyed > 1) return stopped;
    }
  }
  return close(*exit);
}

}  // namespace

Exit follow(RobotLine& line, const FollowChoice& choice) { return Follower(line, choice).run(); }

}  // namespace pastern::tools
