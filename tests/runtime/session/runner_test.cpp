// Whole sessions on the puppet: the same content twice, and after being left and resumed at every walk.
#include "runtime/session/runner.h"

#include <google/protobuf/text_format.h>
#include <gtest/gtest.h>

#include "tests/faults/full_disk_vfs.h"
#include "tests/runtime/session/setting.h"

namespace pastern::session {
namespace {

struct Case {
  Case() : robot(test::shipped_robot("dunlin12")), policy(test::trot_file(robot)) {
    given.robot = &robot;
    given.start = &policy;
    given.plan = test::short_plan();
    given.plugin = test::puppet_path();
    given.plugin_options = test::puppet_options(robot.robot());
    given.plugin_seed = 3;
  }
  void fault(const std::string& text) { given.plugin_options = test::puppet_options(robot.robot(), text); }

  files::RobotFile robot;
  files::PolicyFile policy;
  InProcess given;
};

struct Pieces {
  std::size_t walks{0};
  std::string digest;
};

// A session in as many processes as it has walks, as far as the robot can tell.
Pieces left_at_every_walk(InProcess given) {
  const test::TestFolder folder;
  given.journal_folder = folder.path();
  given.after_walk = [](const v1::Episode&) { return false; };
  InProcessResult last = run_session_in_process(given);
  given.resume = true;
  std::size_t walks = last.episodes.size();
  while (last.ended.how == Ended::How::interrupted && walks < 200) {
    last = run_session_in_process(given);
    walks += last.episodes.size();
  }
  EXPECT_EQ(last.ended.how, Ended::How::verdict) << last.ended.words;
  return {walks, last.digest};
}

TEST(Runner, WalksASessionToItsVerdictTheSameTwice) {
  const Case once;
  const InProcessResult first = run_session_in_process(once.given);
  const InProcessResult second = run_session_in_process(once.given);
  ASSERT_EQ(first.ended.how, Ended::How::verdict) << first.ended.words;
  ASSERT_TRUE(first.verdict);
  EXPECT_EQ(first.episodes.size(), 2U + 8U + 10U);
  EXPECT_FALSE(first.digest.empty());
  EXPECT_EQ(first.digest, second.digest);
  for (const v1::Episode& episode : first.episodes) {
    EXPECT_EQ(episode.outcome(), v1::COMPLETED);
    EXPECT_GT(episode.terms().forward(), 0);
    EXPECT_EQ(episode.parameters_sha256().size(), 32U);
  }
  EXPECT_NE(first.episodes[0].terms().total(), first.episodes[1].terms().total());  // draws differ
  EXPECT_GT(first.episodes[1].started_s(), first.episodes[0].started_s() + 0.6);
}

TEST(Runner, AnotherSeedIsAnotherSession) {
  Case once;
  const InProcessResult first = run_session_in_process(once.given);
  once.given.plan.set_seed(8);
  EXPECT_NE(run_session_in_process(once.given).digest, first.digest);
}

// Faults make some walks void and some falls, so that these are resumed over as well.
TEST(Runner, LeftAndResumedAfterEveryWalkItEndsWithTheSameContent) {
  Case once;
  once.given.plan.set_max_falls(20);
  once.fault("fault=tilt;at=2300;for=400;only_draw=3");
  const InProcessResult whole = run_session_in_process(once.given);
  ASSERT_EQ(whole.ended.how, Ended::How::verdict) << whole.ended.words;
  int falls = 0;
  for (const v1::Episode& episode : whole.episodes) falls += episode.outcome() == v1::FELL ? 1 : 0;
  EXPECT_GT(falls, 0);

  const Pieces last = left_at_every_walk(once.given);
  EXPECT_EQ(last.walks, whole.episodes.size());
  EXPECT_EQ(last.digest, whole.digest);
}

// The same on the simulated robot, with its heat, charge and faults of a cold site.
TEST(Runner, OnTheSimulatedRobotASessionLeftAtEveryWalkEndsWithTheSameContent) {
  Case once;
  once.given.plugin = STUB_PATH;
  once.given.plugin_options =
      std::string("scenario=") + PASTERN_SOURCE_DIR + "/hal_stub/scenarios/cold_store.scenario.txtpb";
  once.given.plan.set_max_falls(1000);
  once.given.plan.set_walk_s(1);
  const InProcessResult whole = run_session_in_process(once.given);
  ASSERT_EQ(whole.ended.how, Ended::How::verdict) << whole.ended.words;
  EXPECT_EQ(run_session_in_process(once.given).digest, whole.digest);
  EXPECT_EQ(left_at_every_walk(once.given).digest, whole.digest);
}

// At wall pace the first frame after a robot was put back on its mark is some ticks old: it still falls the
// last millimetres, and gravity is hardly felt. The gate must have forgotten that when the robot rises.
TEST(Runner, ARobotPutDownInMidFallRisesWithoutATrip) {
  const Case once;
  const std::string options =
      std::string("scenario=") + PASTERN_SOURCE_DIR + "/hal_stub/scenarios/cold_store.scenario.txtpb";
  std::string error;
  auto drives = hal::Drives::open(drives_config(once.robot, STUB_PATH, options, 5, Pace::stepped), error);
  ASSERT_TRUE(drives) << error;
  Cycle cycle(once.robot.robot(), once.policy.policy(), std::move(drives), Pace::stepped);
  for (std::uint64_t draw = 0; draw < 4; ++draw) {
    for (const double late_s : {0.001, 0.002, 0.003, 0.008}) {
      ASSERT_TRUE(cycle.drives().carry_back(draw));
      ASSERT_TRUE(cycle.run(Motion::parked, late_s).completed);
      cycle.set_down();
      ASSERT_TRUE(cycle.run(Motion::parked, 0.1).completed);
      const MotionResult risen = cycle.run(Motion::rise, 0);
      ASSERT_TRUE(risen.completed) << "draw " << draw << ", " << late_s
                                   << " s: " << safety::name(risen.trip.cause) << " " << risen.trip.value;
      ASSERT_TRUE(cycle.run(Motion::lower, 0).completed);
    }
  }
}

TEST(Runner, AFaultThatHasNothingToDoWithWalkingMakesVoidWalks) {
  Case once;
  once.given.plan.set_max_void_repeats(20);
  once.fault("fault=lost;at=2300;for=60;only_draw=4");
  const InProcessResult result = run_session_in_process(once.given);
  ASSERT_EQ(result.ended.how, Ended::How::verdict) << result.ended.words;
  int voids = 0;
  for (const v1::Episode& episode : result.episodes) {
    if (episode.outcome() != v1::VOID) continue;
    ++voids;
    EXPECT_EQ(episode.void_reason(), "frame_stale");
    EXPECT_EQ(episode.trip().cause(), "frame_stale");
    EXPECT_EQ(episode.trip().unit(), "s");
  }
  EXPECT_GT(voids, 0);
  EXPECT_EQ(result.episodes.size(), 20U + static_cast<std::size_t>(voids));
}

TEST(Runner, ATripBeforeTheWalkIsAVoidWalkToo) {
  Case once;
  once.fault("fault=nan;at=400;for=5");
  const InProcessResult result = run_session_in_process(once.given);
  EXPECT_EQ(result.ended.how, Ended::How::verdict);
  EXPECT_EQ(result.episodes.size(), 4U);  // the first walk and three repeats
  EXPECT_EQ(result.episodes[0].void_reason(), "tripped before the walk: frame_not_finite");
  EXPECT_EQ(result.verdict->kind(), v1::Verdict::KEEP);
}

TEST(Runner, AnEmergencyStopWaitsForAPerson) {
  Case once;
  once.fault("fault=estop;at=2300;for=10");
  const InProcessResult result = run_session_in_process(once.given);
  EXPECT_EQ(result.ended.how, Ended::How::interrupted);
  EXPECT_NE(result.ended.words.find("release"), std::string::npos) << result.ended.words;
  EXPECT_EQ(result.episodes.size(), 1U);
}

TEST(Runner, WaitsForWarmWindingsInSimulatedTime) {
  Case once;
  once.fault("fault=hot;at=0;for=5000");
  once.given.plan.set_search_walks(0);
  once.given.plan.set_baseline_walks(1);
  const InProcessResult result = run_session_in_process(once.given);
  ASSERT_EQ(result.ended.how, Ended::How::verdict) << result.ended.words;
  ASSERT_EQ(result.episodes.size(), 1U);
  EXPECT_GE(result.episodes[0].started_s(), 4.9);
}

TEST(Runner, APackBelowItsFloorEndsTheWaitInWords) {
  Case once;
  once.fault("fault=low_pack;at=0;for=100000000");
  const InProcessResult result = run_session_in_process(once.given);
  EXPECT_EQ(result.ended.how, Ended::How::interrupted);
  EXPECT_NE(result.ended.words.find("pack"), std::string::npos) << result.ended.words;
  EXPECT_TRUE(result.episodes.empty());
}

TEST(Runner, AnOfferedCandidateOfAnotherStructureIsRefused) {
  Case once;
  v1::Policy other = once.policy.policy();
  other.set_gait_hz(2);
  const files::PolicyFile candidate = test::policy_file(once.robot, other);
  once.given.plan = test::short_plan(v1::Adaptation::OFFERED_CANDIDATE);
  once.given.candidate = &candidate;
  const InProcessResult result = run_session_in_process(once.given);
  EXPECT_EQ(result.ended.how, Ended::How::refused);
  EXPECT_NE(result.ended.words.find("differ"), std::string::npos) << result.ended.words;
}

TEST(Runner, InProcessRefusesRealDrives) {
  Case once;
  once.given.plugin = test::real_puppet_path();
  EXPECT_EQ(run_session_in_process(once.given).ended.how, Ended::How::refused);
}

TEST(Runner, AFullDiskEndsTheSessionInOrderAndKeepsAllFinishedWalks) {
  Case once;
  const test::TestFolder folder;
  once.given.journal_folder = folder.path();
  faults::FullDisk disk;
  once.given.vfs = disk.vfs();
  int walks = 0;
  once.given.after_walk = [&walks, &disk](const v1::Episode&) {
    if (++walks == 3) disk.leave(0);
    return true;
  };
  const InProcessResult result = run_session_in_process(once.given);
  disk.leave(-1);
  EXPECT_EQ(result.ended.how, Ended::How::failed);
  EXPECT_NE(result.ended.words.find("no further walk"), std::string::npos) << result.ended.words;
  EXPECT_EQ(walks, 3);
  std::string error;
  const auto journal = journal::Journal::open(folder.path(), error);
  ASSERT_TRUE(journal) << error;
  EXPECT_EQ(journal->finished(1).size(), 3U);
}

TEST(Runner, AFallSaysWhatTheEstimateSaw) {
  Case once;
  once.given.plan.set_max_falls(1);
  once.fault("fault=tilt;at=2300;for=400");
  const InProcessResult result = run_session_in_process(once.given);
  ASSERT_EQ(result.episodes.size(), 1U);
  EXPECT_EQ(result.episodes[0].outcome(), v1::FELL);
  EXPECT_EQ(result.episodes[0].trip().cause(), "fall_tilt");
  EXPECT_GT(result.episodes[0].trip().value(), result.episodes[0].trip().limit());
  EXPECT_DOUBLE_EQ(result.episodes[0].terms().fall(), -1);
}

// Hooks of a person at operator pace.
class Person final : public Hooks {
 public:
  bool wait(const std::string& what) override {
    waits.push_back(what);
    return act && act(what);
  }
  void on_episode(const v1::Episode& episode) override {
    episodes.push_back(episode);
    if (told) told();
  }
  void on_verdict(const v1::Verdict& verdict) override { verdicts.push_back(verdict); }

  std::function<bool(const std::string&)> act;
  std::function<void()> told;
  std::vector<std::string> waits;
  std::vector<v1::Episode> episodes;
  std::vector<v1::Verdict> verdicts;
};

struct Desk {
  explicit Desk(bool confirmed = true, const std::string& fault = "")
      : robot(test::shipped_robot("dunlin12")),
        policy(test::trot_file(robot)),
        cycle(robot.robot(), policy.policy(), test::puppet(robot, fault)),
        mover(make_stepped_mover(cycle)) {
    std::string error;
    journal = journal::Journal::open(folder.path(), error);
    if (confirmed) (void)journal->confirm_first_start({files::hex(robot.sha256()), "test", "now"}).ok;
    runner = std::make_unique<Runner>(robot, *mover, *journal, person);
    plan = test::short_plan(v1::Adaptation::SEQUENTIAL_HILL_CLIMBING);
    plan.mutable_adaptation()->clear_batch();
    plan.set_go_by(v1::Plan::OPERATOR);
    plan.set_search_walks(1);  // no batch fits: baseline, then the verdict
    person.act = [this](const std::string& what) {
      if (what == "go") runner->go();
      return what == "go";
    };
  }
  Ended run() {
    std::string text;
    EXPECT_TRUE(google::protobuf::TextFormat::PrintToString(plan, &text));
    return runner->run({plan, text, policy, std::nullopt});
  }

  test::TestFolder folder;
  files::RobotFile robot;
  files::PolicyFile policy;
  Cycle cycle;
  std::unique_ptr<Mover> mover;
  std::unique_ptr<journal::Journal> journal;
  Person person;
  std::unique_ptr<Runner> runner;
  v1::Plan plan;
};

TEST(Runner, NothingWalksBeforeTheFirstStartIsConfirmed) {
  Desk desk(false);
  EXPECT_EQ(desk.run().how, Ended::How::refused);
  EXPECT_EQ(desk.runner->walk(desk.policy, 1, 1).how, Ended::How::refused);
  EXPECT_EQ(desk.runner->resume().how, Ended::How::refused);
  EXPECT_EQ(desk.cycle.report().ticks, 0U);
  EXPECT_FALSE(desk.journal->last_session());
}

TEST(Runner, AtOperatorPaceEveryWalkAndTheVerdictWaitForGo) {
  Desk desk;
  EXPECT_EQ(desk.run().how, Ended::How::verdict);
  EXPECT_EQ(desk.person.episodes.size(), 2U);
  EXPECT_EQ(desk.person.waits, (std::vector<std::string>{"go", "go", "go"}));
  EXPECT_EQ(desk.person.verdicts.size(), 1U);
}

TEST(Runner, AFinishedWalkCanBeDeclaredVoidUntilTheNextBegins) {
  Desk desk;
  bool marked = false;
  desk.person.act = [&](const std::string& what) {
    if (what != "go") return false;
    std::string words;
    if (desk.person.episodes.size() == 2 && !marked) {
      marked = true;
      EXPECT_FALSE(desk.runner->mark_void(1, "bumped", words)) << words;
      EXPECT_TRUE(desk.runner->mark_void(2, "bumped", words)) << words;
      EXPECT_FALSE(desk.runner->mark_void(2, "bumped", words)) << words;
    }
    desk.runner->go();
    return true;
  };
  EXPECT_EQ(desk.run().how, Ended::How::verdict);
  const auto finished = desk.journal->finished(1);
  ASSERT_EQ(finished.size(), 3U);
  EXPECT_EQ(finished[1].episode.outcome(), v1::VOID);
  EXPECT_EQ(finished[1].episode.void_reason(), "bumped");
  EXPECT_EQ(finished[2].episode.index(), 1U);
  EXPECT_NE(finished[2].episode.draw(), finished[1].episode.draw());
  // Published: walks 1 and 2, walk 2 again as void, walk 3.
  ASSERT_EQ(desk.person.episodes.size(), 4U);
  EXPECT_EQ(desk.person.episodes[2].outcome(), v1::VOID);
}

TEST(Runner, AnOperatorsStopMakesTheWalkVoidAndWaitsForRelease) {
  Desk desk;
  bool stopped = false;
  desk.person.act = [&](const std::string& what) {
    std::string words;
    if (what == "release") {
      EXPECT_TRUE(desk.runner->release(words)) << words;
      return true;
    }
    if (desk.person.episodes.size() == 1 && !stopped) {
      stopped = true;
      desk.mover->signals().stop.store(true);
      desk.runner->rest();
      return true;
    }
    desk.runner->go();
    return true;
  };
  EXPECT_EQ(desk.run().how, Ended::How::verdict);
  EXPECT_EQ(desk.person.episodes.size(), 2U);
  EXPECT_NE(std::find(desk.person.waits.begin(), desk.person.waits.end(), "release"),
            desk.person.waits.end());
}

// Stopped while the robot got ready, after the go: releasing permits a walk, it must not start one (ISO
// 13850).
TEST(Runner, AReleaseDoesNotStartTheWalkThatAStopHeldUp) {
  Desk desk;
  bool stopped = false;
  desk.person.act = [&](const std::string& what) {
    std::string words;
    if (what == "go") {
      desk.runner->go();
      if (!stopped)
        desk.mover->signals().stop.store(true);  // with the go: the gate sees it with the next tick
      stopped = true;
      return true;
    }
    EXPECT_EQ(what, "release");
    EXPECT_TRUE(desk.runner->release(words)) << words;
    return true;
  };
  EXPECT_EQ(desk.run().how, Ended::How::verdict);
  EXPECT_EQ(desk.person.waits, (std::vector<std::string>{"go", "release", "go", "go", "go"}));
  for (const v1::Episode& episode : desk.person.episodes) EXPECT_EQ(episode.outcome(), v1::COMPLETED);
}

TEST(Runner, ASingleWalkThatWasStoppedBeforeItBeganHasToBeAskedForAgain) {
  Desk desk;
  desk.person.act = [&](const std::string& what) {
    std::string words;
    EXPECT_EQ(what, "release");
    EXPECT_TRUE(desk.runner->release(words)) << words;
    return true;
  };
  desk.mover->signals().stop.store(true);
  EXPECT_EQ(desk.runner->walk(desk.policy, 0.5, 9).how, Ended::How::refused);
  EXPECT_TRUE(desk.person.episodes.empty());
  EXPECT_EQ(desk.runner->walk(desk.policy, 0.5, 9).how, Ended::How::verdict);
}

// A simulated robot at auto pace gets up by itself after a fall, but not when somebody has stopped it since.
TEST(Runner, AStopThatComesAfterAFallWaitsForAPerson) {
  Desk desk;
  desk.plan.set_go_by(v1::Plan::AUTO);
  desk.cycle.signals().internal_stop.store(true);  // a trip that auto pace releases by itself ...
  desk.runner->rest();
  ASSERT_EQ(desk.cycle.report().trip.cause, safety::Cause::internal_stop);
  desk.mover->signals().stop.store(true);  // ... but this one is a person's
  desk.person.act = [](const std::string&) { return false; };
  const Ended ended = desk.run();
  EXPECT_EQ(ended.how, Ended::How::interrupted);
  EXPECT_TRUE(desk.mover->signals().stop.load());
  EXPECT_EQ(desk.cycle.report().phase, safety::Phase::off);
  EXPECT_TRUE(desk.person.episodes.empty());
  EXPECT_EQ(desk.person.waits, (std::vector<std::string>{"release"}));
}

TEST(Runner, AReleaseDoesNotClearAStopThatCameAfterIt) {
  Desk desk;
  std::string words;
  desk.mover->signals().stop.store(true);
  desk.mover->signals().stops_asked.store(1);
  EXPECT_FALSE(desk.runner->release(words));  // not seen by the gate yet
  EXPECT_TRUE(desk.mover->signals().stop.load());
  desk.runner->rest();
  EXPECT_FALSE(desk.runner->release(words, 0));
  EXPECT_NE(words.find("since"), std::string::npos) << words;
  EXPECT_EQ(desk.cycle.report().phase, safety::Phase::off);
  EXPECT_TRUE(desk.runner->release(words, 1)) << words;
}

// So that a program that is killed before anybody was asked comes back tripped.
TEST(Runner, ATripIsKeptBeforeItsWalkIsTold) {
  Desk desk(true, "fault=estop;at=2300;for=10");
  std::string kept;
  desk.person.told = [&] { kept = desk.journal->get("latched_trip").value_or(""); };
  EXPECT_EQ(desk.run().how, Ended::How::interrupted);
  ASSERT_EQ(desk.person.episodes.size(), 1U);
  EXPECT_EQ(desk.person.episodes[0].outcome(), v1::VOID);
  EXPECT_EQ(kept, "emergency_stop");
}

TEST(Runner, AnOperatorsStopOutlivesTheProgramAtAutoPaceToo) {
  Desk desk;
  desk.plan.set_search_walks(2);  // a plan that can be read again
  desk.plan.set_go_by(v1::Plan::AUTO);
  desk.mover->signals().stop.store(true);
  desk.person.act = [](const std::string&) { return false; };
  EXPECT_EQ(desk.run().how, Ended::How::interrupted);
  Cycle cycle(desk.robot.robot(), desk.policy.policy(), test::puppet(desk.robot));
  const auto mover = make_stepped_mover(cycle);
  desk.person.waits.clear();
  Runner second(desk.robot, *mover, *desk.journal, desk.person);
  EXPECT_EQ(second.resume().how, Ended::How::interrupted);
  EXPECT_EQ(desk.person.waits, (std::vector<std::string>{"release"}));
  EXPECT_EQ(cycle.report().phase, safety::Phase::off);
}

TEST(Runner, ALatchedTripOutlivesTheProgram) {
  Desk desk;
  desk.person.act = [&](const std::string& what) {
    if (what == "go") desk.mover->signals().stop.store(true);
    if (what == "go") desk.runner->rest();
    return what == "go";
  };
  EXPECT_EQ(desk.run().how, Ended::How::interrupted);
  const auto again = [&desk] {
    return std::make_unique<Cycle>(desk.robot.robot(), desk.policy.policy(), test::puppet(desk.robot));
  };
  const auto second_cycle = again();
  const auto second_mover = make_stepped_mover(*second_cycle);
  Runner second(desk.robot, *second_mover, *desk.journal, desk.person);
  EXPECT_EQ(second_cycle->report().phase, safety::Phase::off);
  std::string words;
  EXPECT_TRUE(second.release(words)) << words;
  const auto third_cycle = again();
  const auto third_mover = make_stepped_mover(*third_cycle);
  const Runner third(desk.robot, *third_mover, *desk.journal, desk.person);
  EXPECT_EQ(third_cycle->report().phase, safety::Phase::armed);
}

// Before a resume, by a program that has just been started.
TEST(Runner, AnInterruptedSessionsStatusKnowsItsPlanAndItsReturns) {
  Desk desk;
  desk.person.act = [&](const std::string& what) {
    if (desk.person.episodes.size() == 6) return false;
    desk.runner->go();
    return what == "go";
  };
  desk.plan.set_search_walks(8);
  ASSERT_EQ(desk.run().how, Ended::How::interrupted);
  v1::Status before;
  desk.runner->fill(before);
  const auto cycle =
      std::make_unique<Cycle>(desk.robot.robot(), desk.policy.policy(), test::puppet(desk.robot));
  const auto mover = make_stepped_mover(*cycle);
  Runner again(desk.robot, *mover, *desk.journal, desk.person);
  v1::Status status;
  again.fill(status);
  EXPECT_EQ(status.session_part(), v1::INTERRUPTED);
  EXPECT_EQ(status.walks_done(), 6U);
  EXPECT_GT(status.walks_planned(), 6U);
  EXPECT_EQ(status.walks_planned(), before.walks_planned());
  EXPECT_NEAR(status.start_return(), before.start_return(), 1e-12);
  EXPECT_NEAR(status.best_return(), before.best_return(), 1e-12);
  EXPECT_EQ(status.joints_size(), 0) << "no frame has been read yet";
  EXPECT_EQ(before.joints_size(), desk.robot.joint_count());
  EXPECT_EQ(before.joints(3).name(), desk.robot.robot().joints(3).name());
  EXPECT_FALSE(before.joints(3).has_target_rad()) << "parked: nothing is asked of the joint";
  EXPECT_GT(before.joints(3).winding_c(), 0);
}

TEST(Runner, WithoutTheBatonNothingBeginsAtSteppedPace) {
  Desk desk;
  desk.plan.set_search_walks(2);  // a plan that can be read again
  desk.mover->signals().baton_lost.store(true);
  EXPECT_EQ(desk.run().how, Ended::How::interrupted);
  EXPECT_TRUE(desk.person.episodes.empty());
  EXPECT_EQ(desk.person.waits, (std::vector<std::string>{"baton"}));
  v1::Status status;
  desk.runner->fill(status);
  EXPECT_EQ(status.session_part(), v1::INTERRUPTED);
  desk.mover->signals().baton_lost.store(false);
  const Ended resumed = desk.runner->resume();
  EXPECT_EQ(resumed.how, Ended::How::verdict) << resumed.words;
}

TEST(Runner, EndedByTheOperatorIsKeepAndCannotBeResumed) {
  Desk desk;
  desk.person.act = [&](const std::string&) {
    if (desk.person.episodes.size() == 1) {
      desk.runner->end();
    } else {
      desk.runner->go();
    }
    return true;
  };
  EXPECT_EQ(desk.run().how, Ended::How::verdict);
  ASSERT_EQ(desk.person.verdicts.size(), 1U);
  EXPECT_EQ(desk.person.verdicts[0].kind(), v1::Verdict::KEEP);
  EXPECT_EQ(desk.runner->resume().how, Ended::How::refused);
}

TEST(Runner, ASingleWalkIsRecordedOutsideSessions) {
  Desk desk;
  EXPECT_EQ(desk.runner->walk(desk.policy, 0.5, 9).how, Ended::How::verdict);
  EXPECT_EQ(desk.runner->walk(desk.policy, 0.5, 10).how, Ended::How::verdict);
  const auto finished = desk.journal->finished(0);
  ASSERT_EQ(finished.size(), 2U);
  EXPECT_EQ(finished[1].episode.part(), v1::SINGLE);
  EXPECT_EQ(finished[1].episode.walk(), 2U);
  EXPECT_EQ(desk.runner->interrupted_session(), 0U);
}

}  // namespace
}  // namespace pastern::session
