// Verbs against the far end of the real link: what is sent, what is said, what the exit status means.
#include <gtest/gtest.h>
#include <sys/stat.h>

#include <algorithm>
#include <chrono>
#include <cstdlib>
#include <fstream>
#include <iterator>
#include <thread>

#include "proto/files/sha256.h"
#include "runtime/journal/journal.h"
#include "tests/tools/run.h"
#include "tests/tools/scripted_robot.h"
#include "tests/tools/synthetic.h"

namespace pastern::testing {
namespace {

v1::Answer answer(bool accepted, const std::string& words) {
  v1::Answer answer;
  answer.set_accepted(accepted);
  answer.set_words(words);
  return answer;
}

bool took(const ScriptedRobot& robot, v1::Command::WhatCase what) {
  const auto taken = robot.taken();
  return std::any_of(taken.begin(), taken.end(),
                     [&](const auto& command) { return command.what_case() == what; });
}

std::string plan_path(const char* name) { return std::string(PASTERN_SOURCE_DIR) + "/tools/plans/" + name; }

class RobotVerbsTest : public ::testing::Test {
 protected:
  void SetUp() override { setenv("XDG_RUNTIME_DIR", folder_.path().c_str(), 1); }
  v1::Status status(v1::SessionPart part = v1::NO_SESSION) {
    v1::Status status = robot_.status();
    status.set_session_part(part);
    status.set_session(part == v1::NO_SESSION ? 0 : 1);
    return status;
  }
  v1::Telemetry numbered() {
    v1::Telemetry telemetry;
    telemetry.set_sequence(++sequence_);
    return telemetry;
  }
  void publish_walk(std::uint64_t walk, v1::Part part) {
    v1::Telemetry telemetry = numbered();
    telemetry.mutable_episode()->set_session(part == v1::SINGLE ? 0 : 1);
    telemetry.mutable_episode()->set_walk(walk);
    telemetry.mutable_episode()->set_part(part);
    telemetry.mutable_episode()->set_outcome(v1::COMPLETED);
    telemetry.mutable_episode()->mutable_terms()->set_total(2.5);
    telemetry.mutable_episode()->mutable_trace()->add_x_m(1);
    robot_.publish(telemetry);
  }
  void publish_verdict(v1::Verdict::Kind kind) {
    v1::Telemetry telemetry = numbered();
    telemetry.mutable_verdict()->set_kind(kind);
    telemetry.mutable_verdict()->set_words(kind == v1::Verdict::ADOPT ? "adopt: so be it" : "keep: so be it");
    v1::Status now = status(v1::ENDED);
    *now.mutable_verdict() = telemetry.verdict();
    robot_.set_status(now);
    robot_.publish(telemetry);
  }
  /// A session of three walks as soon as it is started.
  void play(v1::Verdict::Kind kind) {
    robot_.script = [this, kind](const v1::Command& command) {
      if (command.has_start_session()) {
        for (std::uint64_t walk = 1; walk <= 3; ++walk) publish_walk(walk, v1::BASELINE);
        publish_verdict(kind);
      }
      return answer(true, "session begins");
    };
  }

  Folder folder_;
  ScriptedRobot robot_;
  std::uint64_t sequence_{0};
};

TEST_F(RobotVerbsTest, StopSaysThatTheRobotConfirmed) {
  const Ran ran = run(robot_.with({"stop"}));
  EXPECT_EQ(ran.exit, 0) << ran.err;
  EXPECT_EQ(lines_of(ran.out).front().rfind("stop: CONFIRMED by the robot", 0), 0U) << ran.out;
  EXPECT_GE(robot_.stops.load(), 1);
  EXPECT_EQ(robot_.halts.load(), 0);
}

TEST_F(RobotVerbsTest, HaltSaysThatTheRobotConfirmed) {
  const Ran ran = run(robot_.with({"halt"}));
  EXPECT_EQ(ran.exit, 0) << ran.err;
  EXPECT_EQ(lines_of(ran.out).front(), "halt: CONFIRMED by the robot: torque is off.");
  EXPECT_GE(robot_.halts.load(), 1);
}

TEST_F(RobotVerbsTest, StopThatIsReceivedButNotConfirmedSaysSo) {
  robot_.confirms = false;
  for (const char* verb : {"stop", "halt"}) {
    const Ran ran = run(robot_.with({verb, "--patience", "1"}));
    EXPECT_EQ(ran.exit, 4);
    EXPECT_EQ(ran.out.find("CONFIRMED"), std::string::npos) << ran.out;
    EXPECT_NE(ran.err.find("NOT CONFIRMED"), std::string::npos) << ran.err;
    EXPECT_NE(ran.err.find("emergency stop in your hand"), std::string::npos);
  }
}

TEST_F(RobotVerbsTest, StopWithoutAnAnswerIsTriedAgainAndSaysThatTheRobotMayMove) {
  const std::string port = std::to_string(silent_port());
  for (const char* verb : {"stop", "halt"}) {
    const Ran ran = run({verb, "--port", port, "--keys", "", "--patience", "1.5"});
    EXPECT_EQ(ran.exit, 4);
    EXPECT_EQ(ran.out.find("CONFIRMED"), std::string::npos) << ran.out;
    EXPECT_NE(ran.err.find("NOT CONFIRMED: no answer from 127.0.0.1:" + port), std::string::npos) << ran.err;
    EXPECT_NE(ran.err.find("(2 tries)"), std::string::npos) << ran.err;
    EXPECT_NE(ran.err.find("may still be moving"), std::string::npos) << ran.err;
    EXPECT_NE(ran.err.find("emergency stop in your hand"), std::string::npos);
  }
}

TEST_F(RobotVerbsTest, StatusTellsTheSameInWordsAndInJson) {
  v1::Status now = status(v1::IN_SEARCH);
  now.set_walks_done(17);
  now.set_walks_planned(71);
  now.set_pack_voltage_v(33.5);
  now.set_ticks(1000);
  robot_.set_status(now);
  const Ran words = run(robot_.with({"status"}));
  EXPECT_EQ(words.exit, 0);
  EXPECT_NE(words.out.find("17 of 71 walks"), std::string::npos) << words.out;
  EXPECT_NE(words.out.find("33.5 V"), std::string::npos);
  const Ran json = run(robot_.with({"status", "--json"}));
  EXPECT_EQ(lines_of(json.out).size(), 1U);
  EXPECT_NE(json.out.find("\"session_part\": \"IN_SEARCH\""), std::string::npos) << json.out;
  EXPECT_NE(json.out.find("\"walks_done\": 17"), std::string::npos);
  EXPECT_EQ(json.out.find("next:"), std::string::npos);
}

TEST_F(RobotVerbsTest, StatusOfATrippedRobotIsSixAndNamesTheNextCommand) {
  v1::Status now = status();
  now.set_robot_state(v1::TRIPPED);
  now.set_waiting_for("release");
  now.mutable_trip()->set_cause("pitch");
  now.mutable_trip()->set_value(0.93);
  now.mutable_trip()->set_unit("rad");
  robot_.set_status(now);
  const Ran ran = run(robot_.with({"status"}));
  EXPECT_EQ(ran.exit, 6);
  EXPECT_NE(ran.out.find("pitch: 0.93 rad"), std::string::npos) << ran.out;
  EXPECT_EQ(lines_of(ran.out).back().rfind("next: pastern release", 0), 0U) << ran.out;
}

TEST_F(RobotVerbsTest, RefusalIsFiveInTheRobotsWords) {
  robot_.script = [](const v1::Command&) { return answer(false, "refused: the robot is busy"); };
  const Ran ran = run(robot_.with({"park"}));
  EXPECT_EQ(ran.exit, 5);
  EXPECT_EQ(ran.err, "pastern park: refused: the robot is busy\n");
}

TEST_F(RobotVerbsTest, RefusalOfATrippedRobotIsSix) {
  robot_.script = [](const v1::Command&) { return answer(false, "tripped"); };
  v1::Status now = status();
  now.set_robot_state(v1::TRIPPED);
  robot_.set_status(now);
  EXPECT_EQ(run(robot_.with({"walk"})).exit, 6);
}

TEST_F(RobotVerbsTest, StartFollowsToTheVerdictAndTellsIt) {
  play(v1::Verdict::ADOPT);
  const Ran ran = run(robot_.with({"start", plan_path("default.plan.txtpb")}));
  EXPECT_EQ(ran.exit, 0) << ran.err;
  const auto lines = lines_of(ran.out);
  EXPECT_EQ(std::count_if(lines.begin(), lines.end(),
                          [](const auto& line) { return line.find("baseline") != std::string::npos; }),
            3);
  EXPECT_NE(ran.out.find("verdict: adopt: so be it"), std::string::npos) << ran.out;
  EXPECT_EQ(lines.back().rfind("next: pastern adopt", 0), 0U) << ran.out;
  EXPECT_TRUE(took(robot_, v1::Command::kStartSession));
}

TEST_F(RobotVerbsTest, KeepIsStatusOneAndQuietTellsTheVerdictOnly) {
  play(v1::Verdict::KEEP);
  const Ran ran = run(robot_.with({"start", plan_path("batch.plan.txtpb"), "--quiet"}));
  EXPECT_EQ(ran.exit, 1) << ran.err;
  EXPECT_EQ(lines_of(ran.out).front(), "verdict: keep: so be it");
}

TEST_F(RobotVerbsTest, JsonOfASessionIsALineAMessageWithoutTraces) {
  play(v1::Verdict::ADOPT);
  const Ran ran = run(robot_.with({"start", plan_path("default.plan.txtpb"), "--json"}));
  EXPECT_EQ(ran.exit, 0);
  for (const std::string& line : lines_of(ran.out)) {
    EXPECT_EQ(line.front(), '{') << line;
    EXPECT_EQ(line.back(), '}') << line;
    EXPECT_EQ(line.find("x_m"), std::string::npos);
  }
  EXPECT_NE(ran.out.find("\"kind\": \"ADOPT\""), std::string::npos) << ran.out;
}

TEST_F(RobotVerbsTest, StartDoesNotTakeAnEarlierSessionsEndForItsOwn) {
  v1::Status ended = status(v1::ENDED);
  ended.mutable_verdict()->set_kind(v1::Verdict::KEEP);
  robot_.set_status(ended);
  robot_.script = [&](const v1::Command& command) {
    if (command.has_start_session()) {
      v1::Telemetry walk = numbered();
      walk.mutable_episode()->set_session(2);
      walk.mutable_episode()->set_walk(1);
      robot_.publish(walk);
      v1::Telemetry verdict = numbered();
      verdict.mutable_verdict()->set_kind(v1::Verdict::ADOPT);
      robot_.publish(verdict);
    }
    return answer(true, "session begins");
  };
  EXPECT_EQ(run(robot_.with({"start", plan_path("default.plan.txtpb")})).exit, 0);
}

TEST_F(RobotVerbsTest, WalkEndsWithItsWalk) {
  robot_.script = [this](const v1::Command& command) {
    if (command.has_walk()) publish_walk(1, v1::SINGLE);
    return answer(true, "one walk begins");
  };
  const Ran ran = run(robot_.with({"walk", "--seconds", "2", "--draw", "7"}));
  EXPECT_EQ(ran.exit, 0) << ran.err;
  EXPECT_NE(ran.out.find("single"), std::string::npos) << ran.out;
  EXPECT_EQ(robot_.taken().back().walk().duration_s(), 2);
  EXPECT_EQ(robot_.taken().back().walk().draw(), 7U);
}

TEST_F(RobotVerbsTest, GoAndVoidUseTheBatonOfTheStartThatRunsHere) {
  // The one that holds it: a `start` in another process would note its baton in the same place.
  robot_.script = [&](const v1::Command& command) {
    if (command.has_start_session()) {
      v1::Status now = status(v1::IN_SEARCH);
      now.set_waiting_for("go");
      now.set_walks_done(4);
      robot_.set_status(now);
    }
    if (command.has_mark_void()) publish_verdict(v1::Verdict::KEEP);
    return answer(true, "done");
  };
  Ran other;
  std::thread second([&] {
    for (int i = 0; i < 200 && !took(robot_, v1::Command::kStartSession); ++i) {
      std::this_thread::sleep_for(std::chrono::milliseconds(20));
    }
    const std::string pastern = std::string(PASTERN_BINARY_DIR) + "/bin/pastern";
    const auto words = robot_.with({"go"});
    const std::string reach = " --port " + words[2] + " --keys ''";
    other.exit = std::system((pastern + " go" + reach + " >/dev/null").c_str());
    if (other.exit == 0)
      other.exit = std::system((pastern + " void --reason bumped" + reach + " >/dev/null").c_str());
    if (other.exit != 0) publish_verdict(v1::Verdict::KEEP);
  });
  const Ran ran = run(robot_.with({"start", plan_path("operator-pace.plan.txtpb")}));
  second.join();
  EXPECT_EQ(other.exit, 0);
  EXPECT_EQ(ran.exit, 1);
  EXPECT_NE(ran.out.find("next: pastern go"), std::string::npos) << ran.out;
  EXPECT_TRUE(took(robot_, v1::Command::kGo));
  ASSERT_TRUE(took(robot_, v1::Command::kMarkVoid));
  const auto taken = robot_.taken();
  EXPECT_EQ(taken.back().mark_void().walk(), 4U);
  EXPECT_EQ(taken.back().mark_void().reason(), "bumped");
}

TEST_F(RobotVerbsTest, ConfirmShowsTheProcedureAndSendsTheHashThatTheRobotRuns) {
  const Ran ran = run(robot_.with({"confirm", "--yes-i-have-read"}));
  EXPECT_EQ(ran.exit, 0) << ran.err;
  for (const char* word : {"gantry", "emergency stop", "low limits", "one joint at a time", "certified"}) {
    EXPECT_NE(ran.out.find(word), std::string::npos) << word;
  }
  const auto taken = robot_.taken();
  ASSERT_FALSE(taken.empty());
  EXPECT_EQ(taken.back().confirm_first_start().robot_sha256_hex(), std::string(64, 'a'));
  EXPECT_TRUE(taken.back().confirm_first_start().read_procedure());
}

TEST_F(RobotVerbsTest, ConfirmRefusesAnotherRobotFileAndAScriptWithoutItsFlag) {
  const std::string robot = std::string(PASTERN_SOURCE_DIR) + "/hal_stub/robots/dunlin12.robot.txtpb";
  const Ran other = run(robot_.with({"confirm", "--yes-i-have-read", robot}));
  EXPECT_EQ(other.exit, 3);
  EXPECT_NE(other.err.find("expected aaaaaaaaaaaa"), std::string::npos) << other.err;
  EXPECT_EQ(run(robot_.with({"confirm"})).exit, 2);
  EXPECT_FALSE(took(robot_, v1::Command::kConfirmFirstStart));
}

class AdoptTest : public RobotVerbsTest {
 protected:
  void SetUp() override {
    RobotVerbsTest::SetUp();
    std::string error;
    const auto journal = journal::Journal::open(folder_.path(), error);
    ASSERT_NE(journal, nullptr) << error;
    for (const char* policy : {"first", "second", "third"}) {
      const std::string hash = files::hex(files::sha256(policy));
      hashes_.push_back(hash);
      ASSERT_TRUE(journal->store_policy(policy, hash).ok);
      ASSERT_TRUE(journal->adopt({hash, "ida", "2026-03-01T10:00:00Z", policy}).ok);
    }
    const std::string bytes = journal->snapshot();
    robot_.fetch_script = [bytes](const v1::Fetch& fetch) {
      v1::Fetched fetched;
      fetched.set_ok(true);
      fetched.set_bytes(fetch.has_policy() ? "third" : bytes.substr(fetch.journal().offset(), 30000));
      fetched.set_total_bytes(bytes.size());
      return fetched;
    };
    v1::Status now = status();
    now.set_policy_sha256_hex(hashes_.back());
    robot_.set_status(now);
  }
  std::vector<std::string> hashes_;
};

TEST_F(AdoptTest, HistoryIsFetchedInPiecesAndListed) {
  const Ran ran = run(robot_.with({"adopt", "--history"}));
  EXPECT_EQ(ran.exit, 0) << ran.err;
  for (const std::string& hash : hashes_)
    EXPECT_NE(ran.out.find(hash.substr(0, 12)), std::string::npos) << ran.out;
  const Ran json = run(robot_.with({"adopt", "--history", "--json"}));
  EXPECT_NE(json.out.find(hashes_[1]), std::string::npos);
}

TEST_F(AdoptTest, BackIsTheOneBeforeAndAPrefixNamesAny) {
  EXPECT_EQ(run(robot_.with({"adopt", "--back"})).exit, 0);
  EXPECT_EQ(files::hex(robot_.taken().back().adopt().policy_sha256()), hashes_[1]);
  EXPECT_EQ(run(robot_.with({"adopt", hashes_[0].substr(0, 8)})).exit, 0);
  EXPECT_EQ(files::hex(robot_.taken().back().adopt().policy_sha256()), hashes_[0]);
  const Ran none = run(robot_.with({"adopt", "0123456789"}));
  EXPECT_EQ(none.exit, 2);
  EXPECT_NE(none.err.find("found 0 policies"), std::string::npos) << none.err;
}

TEST_F(AdoptTest, WithoutAWordItIsWhatTheVerdictProposes) {
  EXPECT_EQ(run(robot_.with({"adopt"})).exit, 0);
  EXPECT_EQ(robot_.taken().back().adopt().policy_sha256(), "");
}

TEST_F(AdoptTest, SaveWritesTheBytesThatHaveTheSum) {
  const std::string path = folder_.path() + "/saved.policy";
  EXPECT_EQ(run(robot_.with({"adopt", "--save", path})).exit, 0);
  std::ifstream file(path, std::ios::binary);
  EXPECT_EQ(std::string(std::istreambuf_iterator<char>(file), {}), "third");
  v1::Status now = status();
  now.set_policy_sha256_hex(hashes_[0]);
  robot_.set_status(now);
  const Ran wrong = run(robot_.with({"adopt", "--save", path + "2"}));
  EXPECT_EQ(wrong.exit, 5);
  struct stat info {};
  EXPECT_NE(stat((path + "2").c_str(), &info), 0);
}

}  // namespace
}  // namespace pastern::testing
