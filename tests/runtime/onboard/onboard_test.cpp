// The onboard program end to end, on the puppet, over the link.
#include <gtest/gtest.h>
#include <signal.h>
#include <unistd.h>

#include <algorithm>
#include <filesystem>
#include <fstream>

#include "runtime/journal/journal.h"
#include "runtime/link/keys.h"
#include "tests/runtime/onboard/process.h"

namespace pastern::test {
namespace {

bool ended(const v1::Status& status) { return status.session_part() == v1::ENDED; }

v1::Plan operator_plan() {
  v1::Plan plan = short_plan();
  plan.set_go_by(v1::Plan::OPERATOR);
  return plan;
}

v1::Command go() {
  v1::Command command;
  command.mutable_go();
  return command;
}

TEST(Onboard, RunsASessionToItsVerdictAndAdopts) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start()) << onboard.output();
  EXPECT_EQ(onboard.status().session_part(), v1::NO_SESSION);
  EXPECT_EQ(onboard.status().waiting_for(), "first-start confirmation");
  ASSERT_TRUE(onboard.take_baton());
  EXPECT_FALSE(onboard.start_session(short_plan()).accepted());
  ASSERT_TRUE(onboard.confirm().accepted());
  const v1::Answer started = onboard.start_session(short_plan());
  ASSERT_TRUE(started.accepted()) << started.words();

  std::vector<v1::Episode> episodes;
  std::optional<v1::Verdict> verdict;
  for (int i = 0; i < 600 && !verdict; ++i) {
    const auto telemetry = onboard.client().next(100);
    if (telemetry && telemetry->has_episode()) episodes.push_back(telemetry->episode());
    if (telemetry && telemetry->has_verdict()) verdict = telemetry->verdict();
  }
  ASSERT_TRUE(verdict);
  EXPECT_EQ(episodes.size(), 20U);
  EXPECT_EQ(episodes.back().walk(), 20U);
  ASSERT_TRUE(onboard.wait_until(ended));
  const v1::Status status = onboard.status();
  EXPECT_EQ(status.walks_done(), 20U);
  EXPECT_EQ(status.verdict().words(), verdict->words());
  EXPECT_EQ(status.policy_sha256_hex(), onboard.policy_sha());

  // Adopted by name, whatever the verdict was; then back to the start policy; both stand in the history.
  v1::Command adopt;
  adopt.mutable_adopt()->set_policy_sha256(verdict->adapted_sha256());
  const v1::Answer adopted = onboard.ask(adopt);
  ASSERT_TRUE(adopted.accepted()) << adopted.words();
  EXPECT_EQ(onboard.status().policy_sha256_hex(), files::hex(verdict->adapted_sha256()));
  std::ifstream file(onboard.journal_folder() + "/adopted.policy", std::ios::binary);
  const std::string bytes((std::istreambuf_iterator<char>(file)), std::istreambuf_iterator<char>());
  EXPECT_EQ(files::raw(files::sha256(bytes)), verdict->adapted_sha256());
  v1::Fetch fetch;
  fetch.mutable_policy()->set_sha256(verdict->adapted_sha256());
  EXPECT_EQ(onboard.client().fetch(fetch)->bytes(), bytes);
  EXPECT_EQ(onboard.end(SIGTERM), 0) << onboard.output();
  EXPECT_NE(onboard.output().find("stopped in order"), std::string::npos);
  std::string error;
  const auto journal = journal::Journal::open(onboard.journal_folder(), error, "", true);
  ASSERT_TRUE(journal) << error;
  ASSERT_EQ(journal->adoptions().size(), 2U) << "the way back leads to the policy it was started with";
  EXPECT_EQ(journal->adoptions()[0].policy_sha256_hex, onboard.policy_sha());
  EXPECT_NE(journal->get(journal::begun_key(1)).value_or("").find(" pace, by "), std::string::npos);
  EXPECT_EQ(journal->get(journal::drives_key(1)), status.drives() + "\n" + status.drives_settings());
  const std::vector<std::string> words = onboard.arguments();
  EXPECT_EQ(status.drives_settings(), *(std::find(words.begin(), words.end(), "--hal-options") + 1));
  EXPECT_FALSE(status.drives().empty());

  ASSERT_TRUE(onboard.start());
  EXPECT_EQ(onboard.status().policy_sha256_hex(), files::hex(verdict->adapted_sha256()));
  EXPECT_EQ(onboard.status().session_part(), v1::ENDED);
  EXPECT_EQ(onboard.status().verdict().words(), verdict->words());
}

TEST(Onboard, KilledAtAnyTimeAndResumedItEndsWithTheSameDigest) {
  Onboard whole;
  ASSERT_TRUE(whole.start());
  ASSERT_TRUE(whole.take_baton());
  ASSERT_TRUE(whole.confirm().accepted());
  ASSERT_TRUE(whole.start_session(short_plan()).accepted());
  ASSERT_TRUE(whole.wait_until(ended));
  ASSERT_EQ(whole.end(SIGINT), 0);

  Onboard killed;
  bool done = false;
  int kills = 0;
  for (int i = 0; i < 40 && !done; ++i) {
    ASSERT_TRUE(killed.start()) << killed.output();
    ASSERT_TRUE(killed.take_baton());
    const v1::Status status = killed.status();
    if (i == 0) {
      ASSERT_TRUE(killed.confirm().accepted());
    }
    if (status.session_part() == v1::INTERRUPTED) {
      v1::Command resume;
      resume.mutable_resume();
      ASSERT_TRUE(killed.ask(resume).accepted());
    } else if (status.session_part() == v1::NO_SESSION) {
      ASSERT_TRUE(killed.start_session(short_plan()).accepted());
    }
    // By progress, so that a slow machine ends the session too; a little later, so that it hits any moment.
    const std::uint64_t enough = status.walks_done() + static_cast<std::uint64_t>(i % 3);
    ASSERT_TRUE(
        killed.wait_until([enough](const v1::Status& s) { return ended(s) || s.walks_done() >= enough; }));
    usleep(1700 * static_cast<unsigned>(i));
    done = ended(killed.status());
    if (!done) ++kills;
    EXPECT_EQ(killed.end(SIGKILL), 128 + SIGKILL);
  }
  EXPECT_TRUE(done);
  EXPECT_GT(kills, 0);
  EXPECT_EQ(killed.digest(), whole.digest());
}

TEST(Onboard, AtOperatorPaceWaitsForGoMarksVoidAndParks) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  ASSERT_TRUE(onboard.confirm().accepted());
  ASSERT_TRUE(onboard.start_session(operator_plan()).accepted());
  const auto waits_after = [&onboard](std::uint64_t walks) {
    return onboard.wait_until([walks](const v1::Status& status) {
      return status.waiting_for() == "go" && status.walks_done() == walks;
    });
  };
  ASSERT_TRUE(waits_after(0));
  ASSERT_TRUE(onboard.ask(go()).accepted());
  ASSERT_TRUE(waits_after(1));
  v1::Command mark;
  mark.mutable_mark_void()->set_walk(1);
  mark.mutable_mark_void()->set_reason("bumped");
  EXPECT_TRUE(onboard.ask(mark).accepted());
  EXPECT_EQ(onboard.status().voids(), 1U);
  ASSERT_TRUE(onboard.ask(go()).accepted());
  ASSERT_TRUE(waits_after(2));
  v1::Command park;
  park.mutable_park();
  EXPECT_TRUE(onboard.ask(park).accepted());
  ASSERT_TRUE(onboard.wait_until([](const v1::Status& s) { return s.session_part() == v1::INTERRUPTED; }));
  EXPECT_FALSE(onboard.ask(go()).accepted());
  v1::Command resume;
  resume.mutable_resume();
  ASSERT_TRUE(onboard.ask(resume).accepted());
  ASSERT_TRUE(waits_after(2));
  v1::Command end_session;
  end_session.mutable_end_session();
  ASSERT_TRUE(onboard.ask(end_session).accepted());
  ASSERT_TRUE(onboard.wait_until(ended));
  EXPECT_EQ(onboard.status().verdict().kind(), v1::Verdict::KEEP);
}

TEST(Onboard, AStopWhileItRestsIsConfirmedLatchesAndIsReleased) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  ASSERT_TRUE(onboard.confirm().accepted());
  v1::Command stop;
  stop.mutable_stop();
  const v1::Answer stopped = onboard.ask(stop);
  EXPECT_TRUE(stopped.confirmed()) << stopped.words();
  ASSERT_TRUE(onboard.wait_until([](const v1::Status& s) { return s.robot_state() == v1::TRIPPED; }));
  EXPECT_EQ(onboard.status().trip().cause(), "operator_stop");
  v1::Command walk;
  walk.mutable_walk()->set_duration_s(1);
  EXPECT_FALSE(onboard.ask(walk).accepted());
  v1::Command release;
  release.mutable_release();
  const v1::Answer released = onboard.ask(release);
  EXPECT_TRUE(released.accepted()) << released.words();
  EXPECT_EQ(onboard.status().robot_state(), v1::PARKED);
  EXPECT_TRUE(onboard.ask(walk).accepted());
}

TEST(Onboard, AStopWhileItRestsOutlivesAKillAtBothPaces) {
  for (const char* pace : {"stepped", "wall"}) {
    Onboard onboard(pace);
    ASSERT_TRUE(onboard.start());
    ASSERT_TRUE(onboard.take_baton());
    ASSERT_TRUE(onboard.confirm().accepted());
    v1::Command stop;
    stop.mutable_stop();
    (void)onboard.ask(stop);
    const auto tripped = [](const v1::Status& s) { return s.robot_state() == v1::TRIPPED; };
    ASSERT_TRUE(onboard.wait_until(tripped));
    usleep(200'000);  // the record follows the trip
    (void)onboard.end(SIGKILL);
    ASSERT_TRUE(onboard.start()) << onboard.output();
    EXPECT_TRUE(onboard.wait_until(tripped)) << pace;
    EXPECT_EQ(onboard.end(SIGTERM), 0);
  }
}

TEST(Onboard, ARepeatedIdIsOneCommandAlsoAfterARestart) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  ASSERT_TRUE(onboard.confirm().accepted());
  v1::Command walk;
  walk.set_id("the-one-walk");
  walk.mutable_walk()->set_duration_s(0.5);
  ASSERT_TRUE(onboard.ask(walk).accepted());
  const v1::Answer again = onboard.ask(walk);
  EXPECT_TRUE(again.accepted());
  EXPECT_TRUE(again.repeated());
  EXPECT_EQ(onboard.end(SIGTERM), 0);
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  EXPECT_TRUE(onboard.ask(walk).repeated());
  v1::Command other;
  other.set_id("the-one-walk");
  other.mutable_walk()->set_duration_s(0.75);
  EXPECT_EQ(onboard.end(SIGTERM), 0);
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  const v1::Answer swallowed = onboard.ask(other);
  EXPECT_FALSE(swallowed.accepted());
  EXPECT_FALSE(swallowed.repeated());
  EXPECT_NE(swallowed.words().find("a new command needs a new id"), std::string::npos) << swallowed.words();
  EXPECT_EQ(onboard.end(SIGTERM), 0);
  std::string error;
  const auto journal = journal::Journal::open(onboard.journal_folder(), error);
  ASSERT_TRUE(journal) << error;
  EXPECT_LE(journal->last_walk(0), 1U);
}

/// Anna and ben with a key each, both listed as operators.
class WithKeys {
 public:
  WithKeys() {
    std::string error;
    EXPECT_TRUE(link::make_pair(robot(), "robot", error)) << error;
    for (const char* name : {"anna", "ben"}) {
      link::GroundKeys keys;
      const std::string folder = folder_.path() + "/" + name;
      EXPECT_TRUE(link::make_pair(folder, name, error)) << error;
      std::filesystem::copy(robot() + "/robot.public", folder + "/robot.public");
      EXPECT_TRUE(link::read_ground_keys(folder, keys, error)) << error;
      EXPECT_TRUE(link::allow(robot(), name, true, keys.public_z85, error)) << error;
    }
  }
  [[nodiscard]] std::string robot() const { return folder_.path() + "/robot"; }
  /// The program started with the keys, and one client at it, who holds the baton.
  [[nodiscard]] std::unique_ptr<link::Client> start(Onboard& onboard, const std::string& name) const {
    EXPECT_TRUE(onboard.start({"--keys", robot()})) << onboard.output();
    link::ClientConfig config;
    const std::size_t ready = onboard.output().find("ready: ");
    EXPECT_EQ(std::sscanf(onboard.output().c_str() + ready, "ready: commands %d, telemetry %d, fetch %d",
                          &config.command_port, &config.telemetry_port, &config.fetch_port),
              3);
    config.key_folder = folder_.path() + "/" + name;
    config.operator_name = name;
    std::string why;
    auto client = link::Client::connect(config, why);
    EXPECT_TRUE(client && client->take_baton(why)) << why;
    return client;
  }

 private:
  TestFolder folder_;
};

TEST(Onboard, WithKeysAnIdBelongsToItsKeyAlsoAfterARestart) {
  const WithKeys keys;
  Onboard onboard;
  v1::Command confirm;
  confirm.set_id("same");
  confirm.mutable_confirm_first_start()->set_robot_sha256_hex(files::hex(onboard.robot().sha256()));
  confirm.mutable_confirm_first_start()->set_read_procedure(true);
  v1::Command walk;
  walk.set_id("same");
  walk.mutable_walk()->set_duration_s(0.5);
  const auto anna = [&] {
    const auto client = keys.start(onboard, "anna");
    const auto answer = client ? client->ask(confirm) : std::nullopt;
    EXPECT_TRUE(answer && answer->accepted()) << (client ? client->trouble() : "");
    EXPECT_EQ(onboard.end(SIGTERM), 0);
    return answer.value_or(v1::Answer{});
  };
  EXPECT_FALSE(anna().repeated());
  {
    const auto ben = keys.start(onboard, "ben");
    ASSERT_TRUE(ben);
    const auto answer = ben->ask(walk);
    ASSERT_TRUE(answer) << ben->trouble();
    EXPECT_TRUE(answer->accepted()) << answer->words();
    EXPECT_FALSE(answer->repeated());
    EXPECT_NE(answer->words().find("one walk begins"), std::string::npos) << answer->words();
    const auto again = ben->ask(walk);
    EXPECT_TRUE(again && again->repeated());
  }
  EXPECT_EQ(onboard.end(SIGTERM), 0);
  EXPECT_TRUE(anna().repeated());
}

TEST(Onboard, FetchesTheJournalAndTelemetryInPieces) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  ASSERT_TRUE(onboard.confirm().accepted());
  ASSERT_TRUE(onboard.start_session(short_plan()).accepted());
  ASSERT_TRUE(onboard.wait_until(ended));
  std::string copy;
  std::uint64_t total = 1;
  while (copy.size() < total) {
    v1::Fetch fetch;
    fetch.mutable_journal()->set_offset(copy.size());
    const auto piece = onboard.client().fetch(fetch);
    ASSERT_TRUE(piece && piece->ok()) << (piece ? piece->words() : onboard.client().trouble());
    copy += piece->bytes();
    total = piece->total_bytes();
  }
  const TestFolder folder;
  std::ofstream(folder.path() + "/copy.journal", std::ios::binary) << copy;
  std::string error;
  const auto journal = journal::Journal::open(folder.path() + "/copy.journal", error, "", true);
  ASSERT_TRUE(journal) << error;
  EXPECT_EQ(journal->finished(1).size(), 20U);
  v1::Fetch fetch;
  fetch.mutable_telemetry()->set_from_sequence(1);
  fetch.mutable_telemetry()->set_to_sequence(1'000'000);
  const auto telemetry = onboard.client().fetch(fetch);
  ASSERT_TRUE(telemetry && telemetry->ok());
  const auto episodes = std::count_if(telemetry->telemetry().begin(), telemetry->telemetry().end(),
                                      [](const v1::Telemetry& t) { return t.has_episode(); });
  EXPECT_GT(episodes, 5);
  fetch.mutable_journal()->set_offset(1'000'000'000);
  const auto beyond = onboard.client().fetch(fetch);
  ASSERT_TRUE(beyond);
  EXPECT_FALSE(beyond->ok());
}

TEST(Onboard, WrongCommandsAreRefusedInOneLine) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  std::vector<v1::Command> wrong(9);
  wrong[0].mutable_start_session()->set_plan_text("this is no plan");
  wrong[1].mutable_go();
  wrong[2].mutable_walk()->set_duration_s(-1);
  wrong[3].mutable_mark_void()->set_walk(1);
  wrong[4].mutable_release();
  wrong[5].mutable_resume();
  wrong[6].mutable_adopt();
  wrong[7].mutable_confirm_first_start()->set_robot_sha256_hex("00");
  wrong[8].mutable_end_session();
  for (const v1::Command& command : wrong) {
    const v1::Answer answer = onboard.ask(command);
    EXPECT_FALSE(answer.accepted()) << answer.words();
    EXPECT_GT(answer.words().size(), 10U);
    EXPECT_EQ(answer.words().find('\n'), std::string::npos) << answer.words();
  }
  v1::Command unread;
  unread.mutable_confirm_first_start()->set_robot_sha256_hex(files::hex(onboard.robot().sha256()));
  EXPECT_FALSE(onboard.ask(unread).accepted());
  EXPECT_EQ(onboard.status().ticks(), 0U);
}

TEST(Onboard, WrongFilesEndInExitStatusThree) {
  const Onboard onboard;
  const TestFolder folder;
  const auto with = [&onboard](const std::string& name, const std::string& value) {
    std::vector<std::string> words = onboard.arguments();
    *(std::find(words.begin(), words.end(), name) + 1) = value;
    return run_onboard(words);
  };
  const std::string text = folder.path() + "/text";
  std::ofstream(text) << "hello";
  for (const char* name : {"--robot", "--policy", "--hal", "--journal"}) {
    const Ran ran = with(name, text);
    EXPECT_EQ(ran.status, 3) << name << ran.output;
    EXPECT_FALSE(ran.output.empty());
  }
  EXPECT_EQ(with("--robot", "/nowhere").status, 3);
  EXPECT_EQ(with("--hal-options", "start=1,2").status, 3);
  EXPECT_EQ(with("--pace", "fast").status, 2);
  EXPECT_EQ(run_onboard({"--help"}).status, 0);
  EXPECT_EQ(run_onboard({}).status, 2);
}

TEST(Onboard, AtWallPaceATerminatedProgramStopsTheWalkInOrder) {
  Onboard onboard("wall");
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  ASSERT_TRUE(onboard.confirm().accepted());
  v1::Command walk;
  walk.mutable_walk()->set_duration_s(60);
  ASSERT_TRUE(onboard.ask(walk).accepted());
  ASSERT_TRUE(onboard.wait_until(
      [](const v1::Status& s) { return s.robot_state() == v1::WALKING || s.robot_state() == v1::TRIPPED; }));
  EXPECT_EQ(onboard.end(SIGTERM), 0) << onboard.output();
  std::string error;
  const auto journal = journal::Journal::open(onboard.journal_folder(), error);
  ASSERT_TRUE(journal) << error;
  const auto finished = journal->finished(0);
  ASSERT_EQ(finished.size(), 1U);
  EXPECT_EQ(finished[0].episode.outcome(), v1::VOID);
}

// The machine held the program up for longer than the drives wait. It trips with its first tick, and after
// the release it stays where it is.
TEST(Onboard, AtWallPaceAProgramThatWasHeldUpTripsAndDoesNotGoOnAfterTheRelease) {
  Onboard onboard("wall");
  ASSERT_TRUE(onboard.start());
  ASSERT_TRUE(onboard.take_baton());
  ASSERT_TRUE(onboard.confirm().accepted());
  v1::Command walk;
  walk.mutable_walk()->set_duration_s(60);
  ASSERT_TRUE(onboard.ask(walk).accepted());
  const auto moves = [](const v1::Status& s) {
    return s.robot_state() == v1::WALKING || s.robot_state() == v1::TRIPPED;
  };
  ASSERT_TRUE(onboard.wait_until(moves));
  onboard.send(SIGSTOP);
  usleep(300'000);
  onboard.send(SIGCONT);
  ASSERT_TRUE(onboard.wait_until([](const v1::Status& s) { return s.robot_state() == v1::TRIPPED; }));
  EXPECT_EQ(onboard.status().trip().cause(), "tick_overrun");
  ASSERT_TRUE(onboard.take_baton());
  v1::Command release;
  release.mutable_release();
  v1::Answer released;
  for (int i = 0; i < 50 && !released.accepted(); ++i) {
    usleep(20'000);
    released = onboard.ask(release);
  }
  EXPECT_TRUE(released.accepted()) << released.words();
  usleep(300'000);
  EXPECT_EQ(onboard.status().robot_state(), v1::PARKED);
  EXPECT_EQ(onboard.end(SIGTERM), 0) << onboard.output();
}

}  // namespace
}  // namespace pastern::test
