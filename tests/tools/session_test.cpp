// The whole line through real programs: onboard program, simulated robot, link, journal, verbs as a person
// types them.
#include <gtest/gtest.h>
#include <signal.h>
#include <sys/wait.h>
#include <unistd.h>

#include <chrono>
#include <cstdlib>
#include <fstream>
#include <iterator>
#include <memory>
#include <random>
#include <thread>

#include "tests/tools/run.h"
#include "tests/tools/synthetic.h"

namespace pastern::testing {
namespace {

const std::string kSource = PASTERN_SOURCE_DIR;
const std::string kBinary = PASTERN_BINARY_DIR;

/// A program of ours, started here and ended by its process number.
class Process {
 public:
  Process(std::vector<std::string> words, const std::string& log) {
    pid_ = fork();
    if (pid_ != 0) return;
    if (std::freopen(log.c_str(), "a", stdout) == nullptr || dup2(STDOUT_FILENO, STDERR_FILENO) < 0)
      _exit(126);
    std::vector<char*> argv;
    for (std::string& word : words) argv.push_back(word.data());
    argv.push_back(nullptr);
    execv(argv[0], argv.data());
    _exit(127);
  }
  ~Process() { (void)end(SIGTERM); }
  Process(const Process&) = delete;
  Process& operator=(const Process&) = delete;
  int end(int signal) {
    if (pid_ > 0) kill(pid_, signal);
    return wait();
  }
  void pause(std::chrono::milliseconds time) const {
    kill(pid_, SIGSTOP);
    std::this_thread::sleep_for(time);
    kill(pid_, SIGCONT);
  }
  int wait() {
    int status = 0;
    if (pid_ > 0) waitpid(pid_, &status, 0);
    pid_ = 0;
    return status;
  }

 private:
  pid_t pid_{0};
};

class SessionTest : public ::testing::Test {
 protected:
  SessionTest() {
    std::random_device random;
    port_ = std::to_string(20000 + static_cast<int>(random() % 4000U) * 3);
    setenv("XDG_RUNTIME_DIR", folder_.path().c_str(), 1);
    plan_ = folder_.path() + "/short.plan.txtpb";
    std::ofstream(plan_)
        << "name: \"short\"\nadaptation { kind: ES_GRADIENT batch: 2 }\nseed: 3\nwalk_s: 2\n"
           "baseline_walks: 2\nsearch_walks: 20\nconfirmation_pairs: 5\nconfirmation_level: 0.05\n"
           "max_falls: 50\nmax_minutes: 60\nmax_void_repeats: 3\ngo_by: AUTO\n";
  }
  std::vector<std::string> with(std::vector<std::string> words) const {
    for (const std::string& word : {std::string("--port"), port_, std::string("--keys"), std::string()}) {
      words.push_back(word);
    }
    return words;
  }
  std::unique_ptr<Process> onboard() const {
    const int port = std::stoi(port_);
    auto process = std::make_unique<Process>(
        std::vector<std::string>{
            kBinary + "/bin/pastern-onboard", "--robot", robot(), "--policy",
            kSource + "/hal_stub/policies/dunlin12.policy", "--hal", kBinary + "/lib/libpastern_hal_stub.so",
            "--hal-options", "scenario=" + kSource + "/hal_stub/scenarios/cold_store.scenario.txtpb",
            "--journal", folder_.path(), "--pace", "stepped", "--command-port", port_, "--telemetry-port",
            std::to_string(port + 1), "--fetch-port", std::to_string(port + 2)},
        folder_.path() + "/onboard.log");
    for (int i = 0; i < 300; ++i) {
      const Ran ran = run(with({"status", "--wait", "0.2"}));
      if (ran.exit == 0 || ran.exit == 6) break;
      std::this_thread::sleep_for(std::chrono::milliseconds(50));
    }
    return process;
  }
  static std::string robot() { return kSource + "/hal_stub/robots/dunlin12.robot.txtpb"; }

  Folder folder_;
  std::string port_;
  std::string plan_;
};

TEST_F(SessionTest, FromTheFirstStartToTheReport) {
  const auto process = onboard();
  const Ran early = run(with({"start", plan_}));
  EXPECT_EQ(early.exit, 5) << early.err;
  EXPECT_NE(early.out.find("next: pastern confirm"), std::string::npos) << early.out;
  ASSERT_EQ(run(with({"confirm", "--yes-i-have-read", robot()})).exit, 0);
  ASSERT_EQ(run(with({"walk", "--seconds", "1"})).exit, 0);

  const Ran session = run(with({"start", plan_}));
  ASSERT_TRUE(session.exit == 0 || session.exit == 1) << session.exit << session.out << session.err;
  EXPECT_NE(session.out.find("verdict: "), std::string::npos) << session.out;
  int walks = 0;
  for (const std::string& line : lines_of(session.out))
    walks += line.find("completed") != std::string::npos ? 1 : 0;
  EXPECT_GE(walks + 6, 32);  // some may leave the lane

  const Ran fetched = run(with({"report", "--text"}));
  ASSERT_EQ(fetched.exit, 0) << fetched.err;
  const Ran read = run({"report", "--text", "--journal", folder_.path()});
  ASSERT_EQ(read.exit, 0) << read.err;
  const auto from_verdict = [](const std::string& text) {
    return text.substr(0, text.find("\nRecord\n")) + text.substr(text.find("\nsession "));
  };
  EXPECT_EQ(from_verdict(fetched.out), from_verdict(read.out));

  const Ran adopted = run(with({"adopt"}));
  EXPECT_EQ(adopted.exit, session.exit == 0 ? 0 : 5) << adopted.err;
  const Ran saved = run(with({"adopt", "--save", folder_.path() + "/saved.policy"}));
  EXPECT_EQ(saved.exit, 0) << saved.err;
  EXPECT_EQ(run({"check", "--robot", robot(), folder_.path() + "/saved.policy"}).exit, 0);
}

/// Value of a field whose value is a text, in a line of JSON; its last one.
std::string last_text(const std::string& json, const std::string& field) {
  const std::string key = "\"" + field + "\": \"";
  const std::size_t at = json.rfind(key);
  if (at == std::string::npos) return "";
  return json.substr(at + key.size(), json.find('"', at + key.size()) - at - key.size());
}

TEST_F(SessionTest, AdoptsTwiceAndGoesBackStepByStepAlsoAfterARestart) {
  auto process = onboard();
  const auto current = [&] { return last_text(run(with({"status", "--json"})).out, "policy_sha256_hex"); };
  const Ran none = run(with({"adopt", "--back"}));
  EXPECT_EQ(none.exit, 2);
  EXPECT_NE(none.err.find("no policy was adopted yet"), std::string::npos) << none.err;
  ASSERT_EQ(run(with({"confirm", "--yes-i-have-read", robot()})).exit, 0);
  std::vector<std::string> way{current()};
  for (int i = 0; i < 2; ++i) {
    const int verdict = run(with({"start", plan_})).exit;
    ASSERT_TRUE(verdict == 0 || verdict == 1);
    const Ran told = run(with({"report", "--json", "--session", std::to_string(i + 1)}));
    way.push_back(last_text(told.out, "adapted_sha256"));
    ASSERT_EQ(way.back().size(), 64U) << told.out.substr(0, 2000);
    const Ran adopted = run(with({"adopt", way.back()}));
    ASSERT_EQ(adopted.exit, 0) << adopted.err;
    EXPECT_EQ(current(), way.back());
    EXPECT_NE(run(with({"adopt", way.back()})).out.find("is current already"), std::string::npos);
  }
  for (const bool restart : {false, true}) {
    if (restart) {
      process->end(SIGTERM);
      process = onboard();
      ASSERT_EQ(run(with({"adopt", way[1].substr(0, 8)})).exit, 0) << "forward again, by its first digits";
      ASSERT_EQ(run(with({"adopt", way[2].substr(0, 8)})).exit, 0);
      EXPECT_EQ(current(), way[2]);
    }
    for (const int step : {1, 0}) {
      const std::size_t to = static_cast<std::size_t>(step);
      const Ran back = run(with({"adopt", "--back"}));
      EXPECT_EQ(back.exit, 0) << back.err;
      EXPECT_NE(back.out.find("policy " + way[to] + " is current"), std::string::npos) << back.out;
      EXPECT_EQ(current(), way[to]) << "step to " << to << " after a restart: " << restart;
    }
    const Ran end = run(with({"adopt", "--back"}));
    EXPECT_EQ(end.exit, 2);
    EXPECT_NE(end.err.find("found the first policy current"), std::string::npos) << end.err;
  }
  const Ran history = run(with({"adopt", "--history"}));
  EXPECT_EQ(history.exit, 0);
  EXPECT_EQ(lines_of(history.out).size(), 1U + 3U + 2U + 2U + 2U + 1U) << history.out;  // head, rows, next
  process->end(SIGTERM);
  process = onboard();
  EXPECT_EQ(current(), way[0]);
  EXPECT_EQ(run(with({"walk", "--seconds", "1"})).exit, 0) << "the policy that it went back to walks";
}

TEST_F(SessionTest, SessionWhoseGroundToolWasKilledWaitsAndIsTakenUpAgain) {
  const auto process = onboard();
  ASSERT_EQ(run(with({"confirm", "--yes-i-have-read", robot()})).exit, 0);
  {
    std::vector<std::string> words = with({kBinary + "/bin/pastern", "start", plan_});
    Process start(words, folder_.path() + "/start.log");
    for (int i = 0; i < 400; ++i) {
      if (run(with({"status", "--json"})).out.find("\"walks_done\": 0") == std::string::npos) break;
      std::this_thread::sleep_for(std::chrono::milliseconds(10));
    }
    (void)start.end(SIGKILL);
  }
  const Ran taken_up = run(with({"resume"}));
  ASSERT_TRUE(taken_up.exit == 0 || taken_up.exit == 1) << taken_up.exit << taken_up.out << taken_up.err;
  EXPECT_NE(taken_up.out.find("verdict: "), std::string::npos);
}

TEST_F(SessionTest, BatonThatLapsedIsTakenUpAgain) {
  const auto process = onboard();
  ASSERT_EQ(run(with({"confirm", "--yes-i-have-read", robot()})).exit, 0);
  Process start(with({kBinary + "/bin/pastern", "start", plan_}), folder_.path() + "/start.log");
  for (int i = 0; i < 400; ++i) {
    if (run(with({"status", "--json"})).out.find("\"walks_done\": 0") == std::string::npos) break;
    std::this_thread::sleep_for(std::chrono::milliseconds(10));
  }
  start.pause(std::chrono::milliseconds(900));  // as a laptop that is too busy; the baton lapses after 500
  const int status = start.wait();
  ASSERT_TRUE(WIFEXITED(status));
  EXPECT_LE(WEXITSTATUS(status), 1);
  std::ifstream log(folder_.path() + "/start.log");
  const std::string said(std::istreambuf_iterator<char>(log), {});
  EXPECT_NE(said.find("the baton had lapsed"), std::string::npos) << said;
}

TEST_F(SessionTest, OnboardProgramThatWasKilledGoesOnWhereItWas) {
  {
    const auto process = onboard();
    ASSERT_EQ(run(with({"confirm", "--yes-i-have-read", robot()})).exit, 0);
    Process start(with({kBinary + "/bin/pastern", "start", plan_}), folder_.path() + "/start.log");
    for (int i = 0; i < 400; ++i) {
      if (run(with({"status", "--json"})).out.find("\"walks_done\": 0") == std::string::npos) break;
      std::this_thread::sleep_for(std::chrono::milliseconds(10));
    }
    (void)process->end(SIGKILL);
    (void)start.end(SIGKILL);
  }
  const auto process = onboard();
  const Ran status = run(with({"status"}));
  EXPECT_NE(status.out.find("next: pastern resume"), std::string::npos) << status.out;
  const Ran resumed = run(with({"resume"}));
  ASSERT_TRUE(resumed.exit == 0 || resumed.exit == 1) << resumed.exit << resumed.out << resumed.err;
  const Ran report = run({"report", "--text", "--journal", folder_.path()});
  EXPECT_NE(report.out.find("\n32 walks counted"), std::string::npos) << report.out;
}

}  // namespace
}  // namespace pastern::testing
