// The link against a client that shares nothing with it but the .proto files, in another language.
#include <gtest/gtest.h>

#include "tests/external/foreign_client/run_client.h"
#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

using external::Ended;
using external::run_client;
using testing::Site;

/// A session that goes on until it is ended: a note every 10 ms.
class Session {
 public:
  explicit Session(Site& site)
      : thread_([this, &site] {
          while (!ending_) {
            site.line.tell(site.line.last_sequence + 1, "walk done");
            std::this_thread::sleep_for(std::chrono::milliseconds(10));
          }
        }) {}
  ~Session() {
    ending_ = true;
    thread_.join();
  }
  Session(const Session&) = delete;
  Session& operator=(const Session&) = delete;

 private:
  std::atomic<bool> ending_{false};
  std::thread thread_;
};

TEST(ForeignClient, watches_a_session_and_stops_it) {
  Site site(false);
  site.start();
  const Session session(site);
  const Ended ended = run_client(site.ports, "--watch 5 --kind note");
  EXPECT_EQ(ended.status, 0) << ended.output;
  EXPECT_NE(ended.output.find("\"robot\": \"scripted\""), std::string::npos) << ended.output;
  EXPECT_NE(ended.output.find("\"fetched\": 5"), std::string::npos) << ended.output;
  EXPECT_NE(ended.output.find("stop confirmed"), std::string::npos) << ended.output;
  EXPECT_EQ(site.line.stops, 1);
}

TEST(ForeignClient, does_so_with_an_operators_key) {
  Site site(true);
  const std::string keys = site.ground("anna", true, true);
  site.start();
  const Session session(site);
  const Ended ended = run_client(site.ports, "--watch 5 --keys " + keys);
  EXPECT_EQ(ended.status, 0) << ended.output;
  EXPECT_EQ(site.line.stops, 1);
}

TEST(ForeignClient, may_watch_but_not_stop_with_an_observers_key) {
  Site site(true);
  const std::string keys = site.ground("screen", true, false);
  site.start();
  const Session session(site);
  const Ended ended = run_client(site.ports, "--watch 5 --keys " + keys);
  EXPECT_EQ(ended.status, 1);
  EXPECT_NE(ended.output.find("stop was refused: refused: key screen observes"), std::string::npos)
      << ended.output;
  EXPECT_EQ(site.line.stops, 0);
}

TEST(ForeignClient, hears_nothing_with_a_key_that_is_not_listed) {
  Site site(true);
  const std::string keys = site.ground("stranger", false, false);
  site.start();
  const Session session(site);
  const Ended ended = run_client(site.ports, "--seconds 1.5 --keys " + keys);
  EXPECT_EQ(ended.status, 1);
  EXPECT_NE(ended.output.find("no answer at port"), std::string::npos) << ended.output;
  EXPECT_EQ(site.line.stops, 0);
}

TEST(ForeignClient, is_told_when_the_robot_does_not_confirm) {
  Site site(false);
  site.line.confirms = false;
  site.start();
  const Session session(site);
  const Ended ended = run_client(site.ports, "--watch 1");
  EXPECT_EQ(ended.status, 1);
  EXPECT_NE(ended.output.find("stop was not confirmed"), std::string::npos) << ended.output;
}

}  // namespace
}  // namespace pastern::link
