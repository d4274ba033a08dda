// The loop, status and telemetry. Sequence numbers of telemetry rise over restarts too: they are reserved in
// the journal by blocks, so that one is never given twice.
#include "runtime/onboard/program.h"

#include <cstdio>
#include <ctime>
#include <utility>

namespace pastern::onboard {
namespace {

constexpr std::chrono::milliseconds kIdle{20};
constexpr std::chrono::milliseconds kStatusEvery{200};
constexpr std::uint64_t kBlock = 10'000;
constexpr std::uint64_t kLookBack = 5'000;
constexpr const char* kReservedKey = "telemetry_reserved";

}  // namespace

std::string now_utc() {
  const std::time_t now = std::time(nullptr);
  std::tm parts{};
  gmtime_r(&now, &parts);
  char text[32];
  const std::size_t length = std::strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &parts);
  return {text, length};
}

Program::Program(Parts parts)
    : parts_(std::move(parts)), runner_(parts_.robot, parts_.mover, parts_.journal, *this) {
  const std::optional<std::string> reserved = parts_.journal.get(kReservedKey);
  sequence_ = reserved ? std::strtoull(reserved->c_str(), nullptr, 10) : parts_.journal.last_sequence();
  reserved_ = sequence_;
  show_status(false);  // the link answers as soon as it is up: never with an empty status
}

void Program::run() {
  publish_missed();
  while (!leave()) {
    serve();
    rest_when_asked();
    if (busy()) {
      do_job();
    } else {
      parts_.exchange.wait(kIdle);
    }
  }
  show_status(true);
}

void Program::do_job() {
  const Job job = std::exchange(job_, Job{});
  session::Ended ended;
  running_ = true;
  begun_by_ = job.who;
  switch (job.kind) {
    case Job::Kind::session:
      ended = runner_.run(*job.setup);
      break;
    case Job::Kind::resume:
      tell_other_drives();
      ended = runner_.resume();
      break;
    case Job::Kind::walk:
      ended = runner_.walk(parts_.policy, job.duration_s, job.draw);
      break;
    case Job::Kind::none:
      break;
  }
  running_ = false;
  // A session says these things itself; a walk outside one, and what was refused, does not.
  const bool said = job.kind != Job::Kind::walk && ended.how != session::Ended::How::refused;
  if (!said && !ended.words.empty()) on_note(ended.words);
  show_status(true);
}

void Program::serve() {
  Asked asked;
  while (parts_.exchange.take(asked)) {
    if (const auto* command = std::get_if<v1::Command>(&asked.what)) {
      answer(asked, *command);
    } else {
      answer(asked, std::get<v1::Fetch>(asked.what));
    }
  }
  if (std::chrono::steady_clock::now() - shown_ >= kStatusEvery) show_status(true);
}

bool Program::wait(const std::string& what) {
  (void)what;  // the status says it: Runner::fill
  show_status(false);
  parts_.exchange.wait(kIdle);
  serve();
  rest_when_asked();
  return true;
}

// At stepped pace nothing ticks while the robot rests; a stop must be seen by the gate all the same. The stop
// that ends this program is no trip to be kept: it is asked for only after leave() says so.
void Program::rest_when_asked() {
  if (parts_.mover.pace() != session::Pace::stepped) {
    if (!leave()) runner_.notice();
    return;
  }
  const session::Signals& signals = parts_.mover.signals();
  const bool stop =
      signals.stop.load(std::memory_order_acquire) || signals.halt.load(std::memory_order_acquire);
  if (!stop || parts_.mover.report().phase == safety::Phase::off) return;
  runner_.rest();
  show_status(true);
}

void Program::show_status(bool to_all) {
  v1::Status status;
  runner_.fill(status);
  status.set_policy_sha256_hex(files::hex(parts_.policy.sha256()));
  if (!runner_.first_start_missing().empty()) status.set_waiting_for("first-start confirmation");
  status.set_drives(parts_.drives);
  status.set_drives_settings(parts_.drives_settings);
  status.set_last_sequence(sequence_);
  if (server_ != nullptr) status.set_baton_holder(server_->baton_holder());
  parts_.exchange.show(status);
  if (!to_all) return;
  shown_ = std::chrono::steady_clock::now();
  v1::Telemetry telemetry = numbered();
  status.set_last_sequence(telemetry.sequence());
  *telemetry.mutable_status() = status;
  publish(telemetry, false);
}

v1::Telemetry Program::numbered() {
  if (sequence_ >= reserved_) {
    reserved_ = sequence_ + kBlock;
    (void)parts_.journal.put(kReservedKey, std::to_string(reserved_)).ok;
  }
  v1::Telemetry telemetry;
  telemetry.set_sequence(++sequence_);
  return telemetry;
}

void Program::publish(const v1::Telemetry& telemetry, bool kept) {
  if (kept) (void)parts_.journal.store_telemetry(telemetry).ok;
  if (server_ != nullptr) server_->publish(telemetry);
}

// A power cut may have come between a walk's record, or a verdict's, and its telemetry.
void Program::publish_missed() {
  const std::optional<journal::SessionRow> row = parts_.journal.last_session();
  if (!row) return;
  const std::uint64_t last = parts_.journal.last_walk(row->session);
  bool walk_told = last == 0;
  bool verdict_told = false;
  const std::uint64_t end = parts_.journal.last_sequence();
  for (const v1::Telemetry& told : parts_.journal.telemetry(end > kLookBack ? end - kLookBack : 1, end)) {
    const bool of_session = told.has_episode() && told.episode().session() == row->session;
    if (of_session) verdict_told = false;
    if (of_session && told.episode().walk() == last) walk_told = true;
    if (told.has_verdict()) verdict_told = true;
  }
  for (const journal::Journal::Finished& walk : parts_.journal.finished(row->session)) {
    if (!walk_told && walk.episode.walk() == last) on_episode(walk.episode);
  }
  const std::optional<v1::Verdict> verdict = parts_.journal.verdict(row->session);
  if (verdict && (!verdict_told || !walk_told)) on_verdict(*verdict);
}

// Beside the record and no part of its digest: when, on what, by whom.
void Program::on_begun(std::uint64_t session) {
  const bool stepped = parts_.mover.pace() == session::Pace::stepped;
  const std::string words = now_utc() + ", " +
                            (parts_.mover.simulated() ? "simulated robot" : "real drives") + ", " +
                            (stepped ? "stepped" : "wall") + " pace, by " + begun_by_;
  // A failed journal stops the session itself.
  (void)parts_.journal.put(journal::begun_key(session), words).ok;
  (void)parts_.journal.put(journal::drives_key(session), parts_.drives + "\n" + parts_.drives_settings).ok;
}

// A session that was begun on one simulated site and goes on on another must not be taken for one.
void Program::tell_other_drives() {
  const std::uint64_t session = runner_.interrupted_session();
  const std::optional<std::string> begun = parts_.journal.get(journal::drives_key(session));
  const std::string now = parts_.drives + "\n" + parts_.drives_settings;
  if (session == 0 || !begun || *begun == now) return;
  const std::string words = "session " + std::to_string(session) +
                            " goes on on other drives or settings: " + parts_.drives + ", " +
                            parts_.drives_settings;
  (void)parts_.journal.note(session, words).ok;
  on_note(words);
}

void Program::on_episode(const v1::Episode& episode) {
  v1::Telemetry telemetry = numbered();
  *telemetry.mutable_episode() = episode;
  publish(telemetry, true);
  show_status(false);
}

void Program::on_verdict(const v1::Verdict& verdict) {
  v1::Telemetry telemetry = numbered();
  *telemetry.mutable_verdict() = verdict;
  publish(telemetry, true);
}

void Program::on_note(const std::string& words) {
  std::printf("%s\n", words.c_str());
  std::fflush(stdout);
  v1::Telemetry telemetry = numbered();
  telemetry.set_note(words);
  publish(telemetry, true);
}

}  // namespace pastern::onboard
