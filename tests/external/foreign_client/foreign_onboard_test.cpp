// The real onboard program against the client in Python: it watches a session on the simulated robot and
// stops it.
#include <gtest/gtest.h>
#include <signal.h>

#include <cstdio>

#include "tests/external/foreign_client/run_client.h"
#include "tests/runtime/onboard/process.h"

namespace pastern::test {
namespace {

using external::Ended;
using external::run_client;

link::Ports ports_of(const Onboard& onboard) {
  link::Ports ports;
  const std::size_t ready = onboard.output().find("ready: ");
  EXPECT_NE(ready, std::string::npos) << onboard.output();
  EXPECT_EQ(std::sscanf(onboard.output().c_str() + ready, "ready: commands %d, telemetry %d, fetch %d",
                        &ports.command, &ports.telemetry, &ports.fetch),
            3);
  return ports;
}

/// Long enough to be stopped in its middle.
v1::Plan long_plan() {
  v1::Plan plan = short_plan();
  plan.set_search_walks(200);
  plan.set_walk_s(2.0);
  plan.set_max_falls(200);
  return plan;
}

void watched_and_stopped(Onboard& onboard) {
  ASSERT_TRUE(onboard.take_baton());
  const v1::Answer confirmed = onboard.confirm();
  ASSERT_TRUE(confirmed.accepted()) << confirmed.words();
  const v1::Answer started = onboard.start_session(long_plan());
  ASSERT_TRUE(started.accepted()) << started.words();
  const Ended ended = run_client(ports_of(onboard), "--watch 1 --kind episode --seconds 60");
  EXPECT_EQ(ended.status, 0) << ended.output;
  EXPECT_NE(ended.output.find("\"robot\": \"dunlin12\""), std::string::npos) << ended.output;
  EXPECT_NE(ended.output.find("stop confirmed"), std::string::npos) << ended.output;
  EXPECT_TRUE(onboard.wait_until([](const v1::Status& status) {
    return status.robot_state() == v1::TRIPPED;
  })) << onboard.status().ShortDebugString();
  EXPECT_LT(onboard.status().walks_done(), 200U);
  EXPECT_EQ(onboard.end(SIGTERM), 0) << onboard.output();
}

TEST(ForeignClientOnboard, watches_and_stops_a_session_on_the_simulated_robot) {
  Onboard onboard;
  ASSERT_TRUE(onboard.start(
      {"--hal", STUB_PATH, "--hal-options",
       std::string("scenario=") + PASTERN_SOURCE_DIR + "/hal_stub/scenarios/good_day.scenario.txtpb"}))
      << onboard.output();
  watched_and_stopped(onboard);
}

TEST(ForeignClientOnboard, watches_and_stops_a_session_at_wall_pace) {
  Onboard onboard("wall");
  ASSERT_TRUE(onboard.start()) << onboard.output();
  watched_and_stopped(onboard);
}

}  // namespace
}  // namespace pastern::test
