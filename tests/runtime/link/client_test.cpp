// The ground's end over real sockets: asking again, gaps, the baton between two clients, a robot that starts
// again.
#include "runtime/link/client.h"

#include <gtest/gtest.h>

#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

using testing::command_named;
using testing::eventually;
using testing::Site;

/// Tells until this client hears it: from then on its subscription stands. Returns the last number told.
std::uint64_t tell_until_heard(Site& site, Client& client) {
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "begin");
    return client.next(20).has_value();
  }));
  while (client.next(50)) {
  }
  return site.line.last_sequence;
}

TEST(Client, a_robot_that_is_not_there_is_said_in_one_line) {
  Site site(false);
  site.start();
  const ClientConfig config = site.config_of();
  site.end();
  std::string error;
  const auto client = Client::connect(config, error);
  ASSERT_NE(client, nullptr) << error;
  EXPECT_FALSE(client->ask(command_named("stop"), 200));
  EXPECT_NE(client->trouble().find("found nobody within 200 ms"), std::string::npos) << client->trouble();
  EXPECT_EQ(client->trouble().find('\n'), std::string::npos);
}

TEST(Client, settings_that_cannot_be_are_refused_in_one_line) {
  std::string error;
  ClientConfig config;
  config.command_port = 0;
  EXPECT_EQ(Client::connect(config, error), nullptr);
  EXPECT_NE(error.find("port 0"), std::string::npos) << error;
  config = ClientConfig{};
  config.host = "not an address";
  EXPECT_EQ(Client::connect(config, error), nullptr);
  EXPECT_NE(error.find("not an address"), std::string::npos) << error;
  config = ClientConfig{};
  config.key_folder = "/nonexistent";
  EXPECT_EQ(Client::connect(config, error), nullptr);
  EXPECT_NE(error.find("/nonexistent"), std::string::npos) << error;
}

TEST(Client, a_slow_answer_is_waited_for_with_one_id) {
  Site site(false);
  site.line.answers = false;
  site.start();
  const auto client = site.client();
  std::string why;
  ASSERT_TRUE(client->take_baton(why)) << why;
  std::thread session([&] {
    EXPECT_TRUE(eventually([&] { return site.line.submitted == 1; }));
    // Longer than a third of the time: by now it has been asked again, over another connection.
    std::this_thread::sleep_for(std::chrono::milliseconds(700));
    v1::Answer answer;
    answer.set_accepted(true);
    answer.set_words("walking");
    site.server->answer(site.line.tickets().at(0), answer);
  });
  const auto answer = client->ask(command_named("go"), 1500);
  session.join();
  ASSERT_TRUE(answer) << client->trouble();
  EXPECT_EQ(answer->words(), "walking");
  EXPECT_EQ(site.line.motions, 1);
}

TEST(Client, a_robot_that_starts_while_it_is_asked_answers) {
  Site site(false);
  site.start();
  site.end();
  const auto client = site.client();
  std::thread starting([&] {
    std::this_thread::sleep_for(std::chrono::milliseconds(300));
    site.start();
  });
  const auto answer = client->ask(command_named("ask_status"), 10'000);
  starting.join();
  EXPECT_TRUE(answer) << client->trouble();
}

TEST(Client, signs_of_life_keep_the_baton_beyond_its_lapse) {
  Site site(false, 1000);
  site.start();
  const auto client = site.client();
  std::string why;
  ASSERT_TRUE(client->take_baton(why)) << why;
  std::this_thread::sleep_for(std::chrono::milliseconds(2500));
  EXPECT_EQ(site.line.batons(), (std::vector<bool>{true}));
  const auto answer = client->ask(command_named("go"));
  ASSERT_TRUE(answer);
  EXPECT_TRUE(answer->accepted()) << answer->words();
  client->give_baton();
  EXPECT_EQ(client->baton(), 0U);
  EXPECT_EQ(site.line.batons(), (std::vector<bool>{true, false}));
}

TEST(Client, a_client_that_dies_loses_the_baton_and_its_number_is_stale) {
  Site site(false, 300);
  site.start();
  auto dies = site.client();
  std::string why;
  ASSERT_TRUE(dies->take_baton(why)) << why;
  const std::uint64_t number = dies->baton();
  dies.reset();
  EXPECT_TRUE(eventually([&] { return site.line.batons() == std::vector<bool>{true, false}; }));
  EXPECT_EQ(site.server->baton_holder(), "");
  const auto late = site.client();
  v1::Command go = command_named("go");
  go.set_baton(number);
  const auto answer = late->ask(go);
  ASSERT_TRUE(answer);
  EXPECT_FALSE(answer->accepted());
  EXPECT_NE(answer->words().find("stale"), std::string::npos) << answer->words();
  EXPECT_EQ(site.line.motions, 0);
}

TEST(Client, two_that_fight_for_the_baton_never_both_have_it) {
  Site site(true);
  const std::string anna = site.ground("anna", true, true);
  const std::string ben = site.ground("ben", true, true);
  site.start();
  std::atomic<int> holders{0};
  std::atomic<int> taken{0};
  std::atomic<int> most{0};
  const auto fight = [&](const std::string& keys) {
    const auto client = site.client(keys);
    for (int i = 0; i < 200 && taken < 20; ++i) {
      std::string why;
      if (!client->take_baton(why)) {
        EXPECT_NE(why.find("holds the baton"), std::string::npos) << why;
        continue;
      }
      most = std::max(most.load(), ++holders);
      taken += 1;
      const auto answer = client->ask(command_named("go"));
      EXPECT_TRUE(answer && answer->accepted()) << (answer ? answer->words() : client->trouble());
      holders -= 1;
      client->give_baton();
    }
  };
  std::thread other([&] { fight(anna); });
  fight(ben);
  other.join();
  EXPECT_EQ(most, 1);
  EXPECT_GE(taken, 20);
  EXPECT_EQ(site.line.motions, taken);
}

TEST(Client, another_process_with_the_same_key_commands_with_the_number) {
  Site site(true);
  const std::string anna = site.ground("anna", true, true);
  const std::string ben = site.ground("ben", true, true);
  site.start();
  const auto holds = site.client(anna);
  std::string why;
  ASSERT_TRUE(holds->take_baton(why)) << why;
  v1::Command go = command_named("go");
  go.set_baton(holds->baton());
  const auto same_key = site.client(anna)->ask(go);
  ASSERT_TRUE(same_key);
  EXPECT_TRUE(same_key->accepted()) << same_key->words();
  const auto other_key = site.client(ben)->ask(go);
  ASSERT_TRUE(other_key);
  EXPECT_FALSE(other_key->accepted());
  EXPECT_EQ(site.line.motions, 1);
}

TEST(Client, a_baton_from_before_a_restart_is_stale) {
  Site site(false);
  site.start();
  const auto client = site.client();
  std::string why;
  ASSERT_TRUE(client->take_baton(why)) << why;
  v1::Command go = command_named("go");
  go.set_baton(client->baton());
  site.end();
  site.start();
  const auto answer = client->ask(go, 10'000);
  ASSERT_TRUE(answer) << client->trouble();
  EXPECT_FALSE(answer->accepted());
  EXPECT_EQ(site.line.motions, 0);
  EXPECT_TRUE(eventually([&] { return client->baton() == 0; })) << "the renewing thread has been told";
  ASSERT_TRUE(client->take_baton(why)) << why;
  go.set_baton(0);
  go.clear_id();
  const auto again = client->ask(go);
  ASSERT_TRUE(again);
  EXPECT_TRUE(again->accepted()) << again->words();
}

TEST(Client, what_a_slow_listener_missed_is_fetched_in_order) {
  Site site(false);
  site.line.piece = 700;  // so that a gap comes in pieces
  site.start();
  const auto client = site.client();
  std::uint64_t last = tell_until_heard(site, *client);
  // Far more than the queues between hold, while nobody listens: the robot drops, and never waits.
  const std::uint64_t end = last + 20'000;
  const std::string filler(500, 'f');
  for (std::uint64_t sequence = last + 1; sequence <= end; ++sequence) {
    site.line.tell(sequence, filler);
    if (sequence % 500 == 0) std::this_thread::sleep_for(std::chrono::milliseconds(2));
  }
  // Something to see the gap by.
  std::atomic<bool> ended{false};
  std::thread more([&] {
    while (!ended) {
      site.line.tell(site.line.last_sequence + 1, "more");
      std::this_thread::sleep_for(std::chrono::milliseconds(50));
    }
  });
  while (last < end) {
    const auto heard = client->next(5000);
    if (!heard || heard->sequence() != last + 1) {
      ADD_FAILURE() << "after " << last << " came " << (heard ? heard->sequence() : 0);
      break;
    }
    last = heard->sequence();
  }
  ended = true;
  more.join();
  EXPECT_GT(site.line.fetches, 0) << "nothing was dropped: this test has shown nothing";
}

TEST(Client, what_the_robot_did_not_keep_stays_missing_and_the_rest_is_in_order) {
  Site site(false);
  site.start();
  const auto client = site.client();
  const std::uint64_t last = tell_until_heard(site, *client);
  site.end();  // nobody publishes: these are missed
  site.start();
  const std::uint64_t jump = last + 10;
  std::optional<v1::Telemetry> heard;
  EXPECT_TRUE(eventually([&] {
    site.line.tell(std::max(site.line.last_sequence + 1, jump), "later", false);
    heard = client->next(20);
    return heard.has_value();
  }));
  ASSERT_TRUE(heard);
  EXPECT_GE(heard->sequence(), jump);
}

TEST(Client, next_begins_after_the_first_status_or_where_it_is_told_to) {
  Site site(false);
  site.start();
  for (std::uint64_t sequence = 1; sequence <= 5; ++sequence) site.line.tell(sequence, "early");
  // What was told is published by another thread: the client must not begin to listen in the middle of it.
  const auto witness = site.client();
  std::uint64_t published = 0;
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "early");
    while (const auto told = witness->next(20)) published = told->sequence();
    return published == site.line.last_sequence;
  }));
  const auto client = site.client();
  ASSERT_TRUE(client->ask(command_named("ask_status")));
  for (int i = 0; i < 4; ++i) site.line.tell(site.line.last_sequence + 1, "perhaps not heard");
  const auto other = site.client();
  other->listen_from(3);
  std::optional<v1::Telemetry> heard;
  std::optional<v1::Telemetry> heard_by_other;
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "now");
    if (!heard) heard = client->next(20);
    if (!heard_by_other) heard_by_other = other->next(20);
    return heard && heard_by_other;
  }));
  ASSERT_TRUE(heard && heard_by_other);
  EXPECT_EQ(heard->sequence(), published + 1);
  EXPECT_EQ(heard_by_other->sequence(), 3U);
}

TEST(Client, a_sequence_that_starts_again_is_heard) {
  Site site(false);
  site.start();
  const auto client = site.client();
  const std::uint64_t before = tell_until_heard(site, *client) + 100;
  EXPECT_TRUE(eventually([&] {
    site.line.tell(before, "high");
    return client->next(20).has_value();
  }));
  while (client->next(50)) {
  }
  site.line.tell(1, "again");
  std::optional<v1::Telemetry> heard = client->next(5000);
  ASSERT_TRUE(heard);
  EXPECT_EQ(heard->sequence(), 1U);
  site.line.tell(2, "again");
  heard = client->next(5000);
  ASSERT_TRUE(heard);
  EXPECT_EQ(heard->sequence(), 2U);
}

}  // namespace
}  // namespace pastern::link
