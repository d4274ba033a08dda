// The process, and the loop of start, drive, kill.
#include "tests/faults/killed_session.h"

#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <random>
#include <vector>

#include "runtime/journal/journal.h"

namespace pastern::faults {
namespace {

using Clock = std::chrono::steady_clock;
constexpr std::chrono::seconds kPatience{30};
constexpr std::uint64_t kKillsASession = 12;

// 2 + 12 + 10 walks of two seconds: every part of a session, in about a second.
constexpr const char* kPlan = R"(name: "kills"
adaptation { kind: ES_GRADIENT batch: 3 }
seed: 1
walk_s: 2
baseline_walks: 2
search_walks: 12
confirmation_pairs: 5
confirmation_level: 0.05
max_falls: 1000
max_minutes: 60
max_void_repeats: 3
go_by: AUTO
)";

double since(Clock::time_point then) { return std::chrono::duration<double>(Clock::now() - then).count(); }

// Next line of the program's output; nothing more within the patience, or at its end: false.
bool read_line(int output, std::string& line) {
  line.clear();
  const Clock::time_point until = Clock::now() + kPatience;
  while (Clock::now() < until) {
    pollfd wait{output, POLLIN, 0};
    if (poll(&wait, 1, 100) <= 0) continue;
    char c = 0;
    if (read(output, &c, 1) != 1) return false;
    if (c == '\n') return true;
    line += c;
  }
  return false;
}

class Driver {
 public:
  Driver(const std::string& plan_text, KillResult& result) : plan_text_(plan_text), result_(result) {}

  /// Connects, takes the baton, and starts or resumes the session. False: `trouble` is set.
  bool begin(const link::ClientConfig& ports) {
    std::string why;
    client_ = link::Client::connect(ports, why);
    if (!client_ || !client_->take_baton(why)) return fail("no baton: " + why);
    v1::Command ask;
    ask.mutable_ask_status();
    auto answer = client_->ask(ask, 20000);
    if (!answer) return fail("no status: " + client_->trouble());
    const v1::Status status = answer->status();
    if (status.session_part() == v1::ENDED) {
      ended_ = true;
      return true;
    }
    if (status.waiting_for() == "first-start confirmation" && !confirm(status.robot_sha256_hex()))
      return false;
    v1::Command begin;
    if (status.session_part() == v1::INTERRUPTED)
      begin.mutable_resume();
    else
      begin.mutable_start_session()->set_plan_text(plan_text_);
    answer = client_->ask(begin, 20000);
    if (!answer || !answer->accepted()) return fail(answer ? answer->words() : client_->trouble());
    return true;
  }

  /// Listens until the verdict or the moment. True when the session has ended.
  bool follow(Clock::time_point until, bool forever) {
    const Clock::time_point patience = Clock::now() + std::chrono::minutes(5);
    while (!ended_ && (forever ? Clock::now() < patience : Clock::now() < until)) {
      const auto telemetry = client_->next(2);
      if (!telemetry) continue;
      if (telemetry->has_episode()) seen_ = std::max(seen_, telemetry->episode().walk());
      if (telemetry->has_verdict()) ended_ = true;
    }
    return ended_;
  }

  [[nodiscard]] std::uint64_t seen() const { return seen_; }

 private:
  bool confirm(const std::string& robot_sha256) {
    v1::Command confirm;
    confirm.mutable_confirm_first_start()->set_robot_sha256_hex(robot_sha256);
    confirm.mutable_confirm_first_start()->set_who("test");
    confirm.mutable_confirm_first_start()->set_read_procedure(true);
    const auto answer = client_->ask(confirm, 20000);
    return (answer && answer->accepted()) ||
           fail("first start: " + (answer ? answer->words() : client_->trouble()));
  }
  bool fail(const std::string& words) {
    result_.trouble = words;
    return false;
  }

  const std::string& plan_text_;
  KillResult& result_;
  std::unique_ptr<link::Client> client_;
  std::uint64_t seen_{0};
  bool ended_{false};
};

// After a kill: what was published as finished must be in the journal. True when the session has ended.
bool check_journal(const std::string& folder, std::uint64_t seen, KillResult& result) {
  std::string error;
  const auto journal = journal::Journal::open(folder, error);
  if (!journal) {
    ++result.unreadable;
    std::fprintf(stderr, "%s\n", error.c_str());
    return false;
  }
  const auto row = journal->last_session();
  const std::uint64_t there = row ? journal->last_walk(row->session) : 0;
  if (there < seen) result.walks_lost += seen - there;
  const bool ended = row && row->ended;
  if (there > 0 && !ended) ++result.during_walks;
  return ended;
}

void read_end(const std::string& folder, KillResult& result) {
  std::string error;
  const auto journal = journal::Journal::open(folder, error);
  const auto row = journal ? journal->last_session() : std::nullopt;
  if (!row || !row->ended) {
    result.trouble = journal ? "the session has not ended" : error;
    return;
  }
  result.walks = journal->last_walk(row->session);
  result.digest = journal->digest(row->session);
}

}  // namespace

Onboard::~Onboard() { kill_now(); }

bool Onboard::start(const OnboardFiles& files, const std::string& folder, std::uint64_t seed,
                    std::string& why) {
  int ends[2] = {-1, -1};
  if (pipe2(ends, O_CLOEXEC) != 0) return false;
  const std::vector<std::string> words{files.program,
                                       "--robot",
                                       files.robot,
                                       "--policy",
                                       files.policy,
                                       "--hal",
                                       files.plugin,
                                       "--hal-options",
                                       "scenario=" + files.scenario,
                                       "--journal",
                                       folder,
                                       "--pace",
                                       "stepped",
                                       "--command-port",
                                       "0",
                                       "--telemetry-port",
                                       "0",
                                       "--fetch-port",
                                       "0",
                                       "--baton-lapse-ms",
                                       "60000",
                                       "--seed",
                                       std::to_string(seed)};
  std::vector<char*> arguments;
  for (const std::string& word : words) arguments.push_back(const_cast<char*>(word.c_str()));
  arguments.push_back(nullptr);
  process_ = fork();
  if (process_ == 0) {
    dup2(ends[1], STDOUT_FILENO);
    dup2(ends[1], STDERR_FILENO);
    execv(arguments[0], arguments.data());
    _exit(127);
  }
  close(ends[1]);
  output_ = ends[0];
  std::string line;
  while (process_ > 0 && read_line(output_, line)) {
    why = line;
    if (std::sscanf(line.c_str(), "ready: commands %d, telemetry %d, fetch %d", &ports_.command_port,
                    &ports_.telemetry_port, &ports_.fetch_port) == 3)
      return true;
  }
  kill_now();
  return false;
}

void Onboard::kill_now() {
  if (process_ > 0) {
    kill(process_, SIGKILL);
    waitpid(process_, nullptr, 0);
  }
  if (output_ >= 0) close(output_);
  process_ = -1;
  output_ = -1;
}

bool Onboard::stop_in_order() {
  if (process_ <= 0) return false;
  kill(process_, SIGTERM);
  int status = -1;
  waitpid(process_, &status, 0);
  process_ = -1;
  if (output_ >= 0) close(output_);
  output_ = -1;
  return WIFEXITED(status) && WEXITSTATUS(status) == 0;
}

KillResult run_killed_session(const OnboardFiles& files, const std::string& folder,
                              const std::string& plan_text, std::uint64_t seed,
                              const std::function<double()>& delay_s) {
  KillResult result;
  const Clock::time_point began = Clock::now();
  std::uint64_t seen = 0;
  while (true) {
    Onboard onboard;
    if (!onboard.start(files, folder, seed, result.trouble)) return result;
    result.trouble.clear();
    Driver driver(plan_text, result);
    if (!driver.begin(onboard.ports())) return result;
    const double delay = delay_s();
    const auto until =
        Clock::now() + std::chrono::duration_cast<Clock::duration>(std::chrono::duration<double>(delay));
    const bool ended = driver.follow(until, delay < 0);
    seen = std::max(seen, driver.seen());
    if (ended || delay < 0) {
      if (!ended) result.trouble = "no verdict within five minutes";
      if (!onboard.stop_in_order()) result.trouble = "the program did not stop in order";
      break;
    }
    onboard.kill_now();
    ++result.kills;
    if (check_journal(folder, seen, result)) break;
  }
  result.seconds = since(began);
  if (result.trouble.empty()) read_end(folder, result);
  return result;
}

OnboardFiles shipped_files(const std::string& source, const std::string& binary, const std::string& robot,
                           const std::string& scenario) {
  const std::string stub = source + "/hal_stub/";
  return {binary + "/bin/pastern-onboard", stub + "robots/" + robot + ".robot.txtpb",
          stub + "policies/" + robot + ".policy", binary + "/lib/libpastern_hal_stub.so",
          stub + "scenarios/" + scenario + ".scenario.txtpb"};
}

namespace {

KillResult session_in_new_folder(const OnboardFiles& files, std::uint64_t seed,
                                 const std::function<double()>& delay_s) {
  std::string folder = (std::filesystem::temp_directory_path() / "pastern_kills_XXXXXX").string();
  KillResult result;
  if (mkdtemp(folder.data()) == nullptr) {
    result.trouble = folder + ": cannot be made";
    return result;
  }
  result = run_killed_session(files, folder, kPlan, seed, delay_s);
  if (!result.trouble.empty()) std::fprintf(stderr, "%s: %s\n", folder.c_str(), result.trouble.c_str());
  std::filesystem::remove_all(folder);
  return result;
}

}  // namespace

bool kill_many(const OnboardFiles& files, std::uint64_t kills, std::uint64_t seed, KillTally& tally) {
  const KillResult whole = session_in_new_folder(files, seed, [] { return -1.0; });
  if (!whole.trouble.empty()) return false;
  tally.walks = whole.walks;
  std::mt19937_64 engine(seed);
  std::uniform_real_distribution<double> delay(0, 0.25 * whole.seconds);
  // A session that cannot go on is a different result, not a reason to try for ever.
  while (tally.sum.kills < kills && tally.different < 20) {
    std::uint64_t left = std::min(kills - tally.sum.kills, kKillsASession);
    const KillResult one = session_in_new_folder(files, seed, [&] {
      if (left == 0) return -1.0;
      --left;
      return delay(engine);
    });
    ++tally.sessions;
    tally.sum.kills += one.kills;
    tally.sum.during_walks += one.during_walks;
    tally.sum.walks_lost += one.walks_lost;
    tally.sum.unreadable += one.unreadable;
    tally.different += one.digest != whole.digest ? 1 : 0;
  }
  return true;
}

}  // namespace pastern::faults
