// The link against a client that shares nothing with it but the .proto files, in another language.
#include <gtest/gtest.h>
#include <sys/wait.h>

#include <array>
#include <cstdio>

#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

using testing::Site;

struct Ended {
  int status{-1};
  std::string output;  ///< stdout and stderr
};

Ended run_client(const Site& site, const std::string& more) {
  const std::string command = std::string("/usr/bin/python3 ") + FOREIGN_CLIENT + " --messages " +
                              FOREIGN_MESSAGES + " --command-port " + std::to_string(site.ports.command) +
                              " --telemetry-port " + std::to_string(site.ports.telemetry) + " --fetch-port " +
                              std::to_string(site.ports.fetch) + " " + more + " 2>&1";
  Ended ended;
  std::FILE* pipe = ::popen(command.c_str(), "r");
  if (pipe == nullptr) return ended;
  std::array<char, 512> part{};
  while (std::fgets(part.data(), part.size(), pipe) != nullptr) ended.output += part.data();
  const int status = ::pclose(pipe);
  ended.status = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
  return ended;
}

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
  const Ended ended = run_client(site, "--watch 5 --kind note");
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
  const Ended ended = run_client(site, "--watch 5 --keys " + keys);
  EXPECT_EQ(ended.status, 0) << ended.output;
  EXPECT_EQ(site.line.stops, 1);
}

TEST(ForeignClient, may_watch_but_not_stop_with_an_observers_key) {
  Site site(true);
  const std::string keys = site.ground("screen", true, false);
  site.start();
  const Session session(site);
  const Ended ended = run_client(site, "--watch 5 --keys " + keys);
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
  const Ended ended = run_client(site, "--seconds 1.5 --keys " + keys);
  EXPECT_EQ(ended.status, 1);
  EXPECT_NE(ended.output.find("no answer at port"), std::string::npos) << ended.output;
  EXPECT_EQ(site.line.stops, 0);
}

TEST(ForeignClient, is_told_when_the_robot_does_not_confirm) {
  Site site(false);
  site.line.confirms = false;
  site.start();
  const Session session(site);
  const Ended ended = run_client(site, "--watch 1");
  EXPECT_EQ(ended.status, 1);
  EXPECT_NE(ended.output.find("stop was not confirmed"), std::string::npos) << ended.output;
}

}  // namespace
}  // namespace pastern::link
