// The robot's end over real sockets: who gets through, who does not, and that a stop is answered in words.
#include <gtest/gtest.h>

#include "runtime/link/caller.h"
#include "runtime/link/wire.h"
#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

using testing::command_named;
using testing::command_names;
using testing::eventually;
using testing::Site;

TEST(Server, without_keys_refuses_anything_but_loopback) {
  testing::ScriptedLine line;
  for (const std::string host :
       {"0.0.0.0", "*", "192.168.1.5", "lo", "::", "example.org", "", "127.0.0.1.5"}) {
    ServerConfig config;
    config.host = host;
    std::string error;
    EXPECT_EQ(Server::start(config, line, error), nullptr) << host;
    EXPECT_NE(error.find("'" + host + "' without keys"), std::string::npos) << error;
    EXPECT_EQ(error.find('\n'), std::string::npos);
  }
}

TEST(Server, listens_on_each_form_of_loopback) {
  testing::ScriptedLine line;
  for (const std::string host : {"127.0.0.1", "localhost", "127.0.0.2"}) {
    ServerConfig config{host, 0, 0, 0, "", 500};
    std::string error;
    const std::unique_ptr<Server> server = Server::start(config, line, error);
    ASSERT_NE(server, nullptr) << error;
    EXPECT_GT(server->ports().command, 0);
  }
}

TEST(Server, a_port_in_use_and_bad_settings_are_refused_in_one_line) {
  Site site(false);
  site.start();
  std::string error;
  ServerConfig config{"127.0.0.1", site.ports.command, 0, 0, "", 500};
  EXPECT_EQ(Server::start(config, site.line, error), nullptr);
  EXPECT_NE(error.find("Address already in use"), std::string::npos) << error;
  config = ServerConfig{"127.0.0.1", 70000, 0, 0, "", 500};
  EXPECT_EQ(Server::start(config, site.line, error), nullptr);
  EXPECT_NE(error.find("70000"), std::string::npos) << error;
  config = ServerConfig{"127.0.0.1", 0, 0, 0, "", 0};
  EXPECT_EQ(Server::start(config, site.line, error), nullptr);
  EXPECT_NE(error.find("baton_lapse_ms"), std::string::npos) << error;
  config = ServerConfig{"127.0.0.1", 0, 0, 0, "/nonexistent", 500};
  EXPECT_EQ(Server::start(config, site.line, error), nullptr);
  EXPECT_NE(error.find("/nonexistent"), std::string::npos) << error;
}

TEST(Server, an_operator_takes_the_baton_and_commands) {
  Site site(true);
  const std::string keys = site.ground("anna", true, true);
  site.start();
  const auto client = site.client(keys);
  std::string why;
  ASSERT_TRUE(client->take_baton(why)) << why;
  const auto answer = client->ask(command_named("go"));
  ASSERT_TRUE(answer) << client->trouble();
  EXPECT_TRUE(answer->accepted()) << answer->words();
  EXPECT_EQ(site.line.motions, 1);
  EXPECT_EQ(site.line.whos().at(0), "operator (key anna)");
  EXPECT_EQ(site.server->baton_holder(), "operator (key anna)");
}

TEST(Server, an_unlisted_key_gets_nothing_through_and_is_told_so) {
  Site site(true);
  const std::string keys = site.ground("stranger", false, false);
  site.start();
  const auto client = site.client(keys);
  for (const std::string& name : command_names()) {
    EXPECT_FALSE(client->ask(command_named(name), 300)) << name;
    EXPECT_NE(client->trouble().find("refused key 'stranger'"), std::string::npos) << client->trouble();
  }
  v1::Fetch fetch;
  (void)fetch.mutable_journal();
  EXPECT_FALSE(client->fetch(fetch, 300));
  site.line.tell(1, "not for strangers");
  EXPECT_FALSE(client->next(300));
  EXPECT_EQ(site.line.submitted + site.line.stops + site.line.halts + site.line.fetches, 0);
}

TEST(Server, a_client_without_keys_gets_nothing_through) {
  Site site(true);
  site.start();
  const auto client = site.client();
  EXPECT_FALSE(client->ask(command_named("stop"), 500));
  EXPECT_NE(client->trouble().find("expected a key folder"), std::string::npos) << client->trouble();
  EXPECT_EQ(site.line.stops, 0);
}

TEST(Server, a_client_with_another_robots_public_key_gets_nothing_through) {
  Site site(true);
  const std::string keys = site.ground("anna", true, true);
  Site other(true);
  std::filesystem::copy_file(other.robot_keys() + "/robot.public", keys + "/robot.public",
                             std::filesystem::copy_options::overwrite_existing);
  site.start();
  const auto client = site.client(keys);
  EXPECT_FALSE(client->ask(command_named("stop"), 500));
  EXPECT_NE(client->trouble().find("robot.public"), std::string::npos) << client->trouble();
  EXPECT_EQ(site.line.stops, 0);
}

TEST(Server, an_observer_may_ask_listen_and_fetch_but_not_command) {
  Site site(true);
  const std::string keys = site.ground("screen", true, false);
  site.start();
  const auto client = site.client(keys);
  for (const std::string& name : command_names()) {
    const auto answer = client->ask(command_named(name));
    ASSERT_TRUE(answer) << name << " " << client->trouble();
    EXPECT_EQ(answer->accepted(), name == "ask_status") << name;
    EXPECT_EQ(answer->words().find("key screen observes") == std::string::npos, name == "ask_status");
  }
  EXPECT_EQ(site.line.submitted + site.line.stops + site.line.halts, 0);
  EXPECT_TRUE(site.line.batons().empty());
  v1::Fetch fetch;
  (void)fetch.mutable_telemetry();
  const auto fetched = client->fetch(fetch);
  ASSERT_TRUE(fetched) << client->trouble();
  EXPECT_TRUE(fetched->ok());
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "walk done");
    return client->next(20).has_value();
  }));
}

TEST(Server, a_revoked_key_is_refused_while_its_connection_is_up) {
  Site site(true);
  const std::string keys = site.ground("anna", true, true);
  site.start();
  const auto client = site.client(keys);
  ASSERT_TRUE(client->ask(command_named("ask_status")));
  std::string error;
  ASSERT_TRUE(revoke(site.robot_keys(), "anna", error)) << error;
  std::optional<v1::Answer> answer;
  EXPECT_TRUE(eventually([&] {
    answer = client->ask(command_named("ask_status"));
    return !answer || !answer->accepted();
  }));
  ASSERT_TRUE(answer) << "the connection was up: " << client->trouble();
  EXPECT_NE(answer->words().find("not on the robot's list"), std::string::npos) << answer->words();
  const auto stop = client->ask(command_named("stop"));
  EXPECT_FALSE(stop && stop->accepted());
  EXPECT_EQ(site.line.stops, 0);
}

TEST(Server, a_revoked_listener_hears_no_more_and_the_others_miss_nothing) {
  Site site(true);
  const std::string anna = site.ground("anna", true, false);
  const std::string ben = site.ground("ben", true, false);
  site.start();
  const auto leaves = site.client(anna);
  const auto stays = site.client(ben);
  ASSERT_TRUE(stays->ask(command_named("ask_status")));
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "walk");
    return leaves->next(10).has_value();
  }));
  std::string error;
  ASSERT_TRUE(revoke(site.robot_keys(), "anna", error)) << error;
  // Until the server has read its list again, anna hears; then silence.
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "walk");
    return !leaves->next(300).has_value();
  }));
  std::uint64_t expected = 1;
  EXPECT_TRUE(eventually([&] {
    site.line.tell(site.line.last_sequence + 1, "walk");
    while (const auto heard = stays->next(50)) {
      EXPECT_EQ(heard->sequence(), expected);
      expected = heard->sequence() + 1;
    }
    return expected > site.line.last_sequence;
  }));
  EXPECT_FALSE(leaves->next(100));
}

TEST(Server, a_key_that_is_allowed_while_the_robot_runs_gets_in) {
  Site site(true);
  const std::string keys = site.ground("late", false, false);
  site.start();
  const auto client = site.client(keys);
  EXPECT_FALSE(client->ask(command_named("ask_status"), 300));
  std::string error;
  ASSERT_TRUE(allow(site.robot_keys(), "late", true, site.key_of("late"), error)) << error;
  EXPECT_TRUE(eventually([&] { return client->ask(command_named("ask_status"), 300).has_value(); }));
}

TEST(Server, stop_and_halt_need_no_baton_and_say_that_the_robot_confirmed) {
  Site site(false);
  site.start();
  const auto client = site.client();
  const auto stop = client->ask(command_named("stop"));
  ASSERT_TRUE(stop);
  EXPECT_TRUE(stop->accepted() && stop->confirmed());
  EXPECT_NE(stop->words().find("stop confirmed"), std::string::npos) << stop->words();
  const auto halt = client->ask(command_named("halt"));
  ASSERT_TRUE(halt);
  EXPECT_TRUE(halt->confirmed());
  EXPECT_NE(halt->words().find("halt confirmed"), std::string::npos) << halt->words();
  EXPECT_EQ(site.line.stops, 1);
  EXPECT_EQ(site.line.halts, 1);
}

TEST(Server, a_stop_that_is_not_confirmed_is_said_to_be_so) {
  Site site(false);
  site.line.confirms = false;
  site.start();
  const auto client = site.client();
  const auto stop = client->ask(command_named("stop"));
  ASSERT_TRUE(stop);
  EXPECT_TRUE(stop->accepted());
  EXPECT_FALSE(stop->confirmed());
  EXPECT_NE(stop->words().find("NOT confirmed"), std::string::npos) << stop->words();
  EXPECT_NE(stop->words().find("emergency stop"), std::string::npos) << stop->words();
  // Sent again while it waited (the client does after 250 ms), it is one stop all the same.
  EXPECT_EQ(site.line.stops, 1);
}

TEST(Server, a_req_socket_is_answered_too) {
  Site site(false);
  site.start();
  wire::Context context;
  wire::Socket socket(context, ZMQ_REQ);
  ASSERT_EQ(zmq_connect(socket.raw(), wire::address("127.0.0.1", site.ports.command).c_str()), 0);
  v1::Command command = command_named("ask_status");
  command.set_format(1);
  command.set_id("1");
  ASSERT_TRUE(wire::send(socket, {command.SerializeAsString()}));
  wire::Incoming incoming;
  ASSERT_TRUE(eventually([&] { return wire::receive(socket, incoming, 2); }));
  v1::Answer answer;
  ASSERT_TRUE(answer.ParseFromString(incoming.frames.at(0)));
  EXPECT_EQ(answer.status().robot(), "scripted");
}

TEST(Server, messages_of_several_frames_and_too_large_ones_are_refused_or_dropped) {
  Site site(false);
  site.start();
  wire::Context context;
  wire::Socket socket(context, ZMQ_DEALER);
  ASSERT_EQ(zmq_connect(socket.raw(), wire::address("127.0.0.1", site.ports.command).c_str()), 0);
  v1::Command stop = command_named("stop");
  stop.set_format(1);
  stop.set_id("s");
  const std::string good = stop.SerializeAsString();
  const std::vector<std::vector<std::string_view>> odd{{""},
                                                       {"", ""},
                                                       {good, good},
                                                       {"", good, good},
                                                       {good, ""},
                                                       {"", "", good},
                                                       std::vector<std::string_view>(100, good)};
  for (const auto& frames : odd) {
    ASSERT_TRUE(wire::send(socket, frames));
    wire::Incoming incoming;
    ASSERT_TRUE(eventually([&] { return wire::receive(socket, incoming, 2); }));
    v1::Answer answer;
    ASSERT_TRUE(answer.ParseFromString(incoming.frames.at(0).empty() ? incoming.frames.at(1)
                                                                     : incoming.frames.at(0)));
    EXPECT_FALSE(answer.accepted());
    EXPECT_NE(answer.words().find("refused: found"), std::string::npos) << answer.words();
  }
  const std::string huge(static_cast<std::size_t>(wire::kLargestCommand) + 1, 'x');
  ASSERT_TRUE(wire::send(socket, {huge}));
  const auto client = site.client();
  EXPECT_TRUE(client->ask(command_named("ask_status")));
  EXPECT_EQ(site.line.stops, 0);
  EXPECT_EQ(site.line.submitted, 0);
}

TEST(Server, a_stop_gets_through_a_flood_of_other_commands) {
  Site site(false);
  site.start();
  std::atomic<bool> flooding{true};
  std::vector<std::thread> flooders;
  for (int i = 0; i < 3; ++i) {
    flooders.emplace_back([&] {
      wire::Context context;
      wire::Socket socket(context, ZMQ_DEALER);
      ASSERT_EQ(zmq_connect(socket.raw(), wire::address("127.0.0.1", site.ports.command).c_str()), 0);
      const std::string junk(200'000, 'j');
      wire::Incoming incoming;
      while (flooding) {
        if (!wire::send(socket, {junk})) std::this_thread::sleep_for(std::chrono::microseconds(100));
        while (wire::receive(socket, incoming, 2)) {
        }
      }
    });
  }
  std::this_thread::sleep_for(std::chrono::milliseconds(200));
  const auto client = site.client();
  for (int i = 0; i < 10; ++i) {
    const auto stop = client->ask(command_named("stop"));
    ASSERT_TRUE(stop) << client->trouble();
    EXPECT_TRUE(stop->confirmed());
  }
  flooding = false;
  for (std::thread& flooder : flooders) flooder.join();
  EXPECT_EQ(site.line.stops, 10);
}

TEST(Server, an_observer_that_fetches_without_end_does_not_fill_the_queue_that_commands_share) {
  Site site(true);
  const std::string keys = site.ground("screen", true, false);
  site.line.answers = false;  // a session thread that is busy
  site.start();
  GroundKeys ground;
  std::string error;
  ASSERT_TRUE(read_ground_keys(keys, ground, error)) << error;
  v1::Fetch fetch;
  fetch.mutable_telemetry()->set_to_sequence(1);
  int refused = 0;
  for (int connection = 0; connection < 5; ++connection) {
    Dial dial;
    dial.host = "127.0.0.1";
    dial.keys = ground;
    wire::Socket socket = dial.socket(ZMQ_DEALER, site.ports.fetch, error);
    ASSERT_TRUE(socket.open()) << error;
    for (int i = 0; i < 100; ++i) ASSERT_TRUE(wire::send(socket, {fetch.SerializeAsString()}));
    wire::Incoming incoming;
    // The first connection uses up all that one key may have under way.
    for (int i = 0; i < (connection == 0 ? 92 : 100); ++i) {
      ASSERT_TRUE(eventually([&] { return wire::receive(socket, incoming, 2); }));
      v1::Fetched fetched;
      ASSERT_TRUE(fetched.ParseFromString(incoming.frames.at(0)));
      refused += fetched.words().find("too many of yours") != std::string::npos ? 1 : 0;
    }
  }
  EXPECT_EQ(refused, 492);
  EXPECT_EQ(site.line.fetches, 8);
}

TEST(Server, ends_in_order_while_clients_are_connected) {
  Site site(false);
  site.start();
  const auto client = site.client();
  ASSERT_TRUE(client->ask(command_named("ask_status")));
  site.end();
  EXPECT_FALSE(client->ask(command_named("ask_status"), 200));
}

}  // namespace
}  // namespace pastern::link
