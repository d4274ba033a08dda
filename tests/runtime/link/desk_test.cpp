// What is done with a command, without sockets and with a clock of the test's own: roles, baton, ids, stops,
// garbage.
#include "runtime/link/desk.h"

#include <gtest/gtest.h>

#include <random>

#include "tests/runtime/link/site.h"

namespace pastern::link {
namespace {

using testing::command_named;
using testing::command_names;
using testing::ScriptedLine;

constexpr std::int64_t kMs = 1'000'000;
constexpr std::int64_t kLapse = 500 * kMs;
constexpr std::uint64_t kFirst = 1'000'000'007;

const Sender kAnna{"key-of-anna", "anna", Role::commander};
const Sender kBen{"key-of-ben", "ben", Role::commander};
const Sender kScreen{"key-of-screen", "screen", Role::observer};
const Sender kGone{"key-of-gone", "", std::nullopt};

class DeskTest : public ::testing::Test {
 protected:
  DeskTest() {
    line_.answers = false;
    line_.confirms = false;
  }

  std::vector<Reply> post(const Sender& from, const std::string& bytes, bool framed = true) {
    std::vector<Mail> mails{Mail{Route{"route-" + from.name, false}, from, bytes, framed}};
    desk_.serve(mails, now_);
    return taken();
  }
  std::vector<Reply> taken() {
    std::vector<Reply> replies;
    replies.swap(desk_.replies());
    return replies;
  }
  static v1::Command made(v1::Command command, const std::string& id, std::uint64_t baton = 0) {
    command.set_format(1);
    command.set_id(id);
    command.set_baton(baton);
    return command;
  }
  v1::Command named(const std::string& name, std::uint64_t baton = 0) {
    return made(command_named(name), "id" + std::to_string(++ids_), baton);
  }
  /// The one answer to one command.
  v1::Answer ask(const Sender& from, const v1::Command& command) {
    const std::vector<Reply> replies = post(from, command.SerializeAsString());
    EXPECT_EQ(replies.size(), 1U) << command.ShortDebugString();
    if (replies.empty()) return {};
    EXPECT_EQ(replies[0].route.id, "route-" + from.name);
    return replies[0].answer;
  }
  std::uint64_t take_baton(const Sender& from) {
    const v1::Answer answer = ask(from, named("take_baton"));
    EXPECT_TRUE(answer.accepted()) << answer.words();
    return answer.baton();
  }
  void pass(std::int64_t ns) {
    now_ += ns;
    desk_.judge(now_);
  }

  ScriptedLine line_;
  Desk desk_{line_, kLapse, kFirst};
  std::int64_t now_{1'000 * kMs};
  int ids_{0};
};

struct Row {
  const char* command;
  bool needs_baton;
  bool observer_may;
};
// Written down a second time on purpose: a new command must be thought about here.
const std::vector<Row> kMatrix{
    {"take_baton", false, false},   {"sign_of_life", true, false}, {"give_baton", true, false},
    {"start_session", true, false}, {"go", true, false},           {"walk", true, false},
    {"mark_void", true, false},     {"stop", false, false},        {"halt", false, false},
    {"release", true, false},       {"resume", true, false},       {"park", true, false},
    {"ask_status", false, true},    {"adopt", true, false},        {"confirm_first_start", true, false},
    {"end_session", true, false},
};

TEST_F(DeskTest, the_matrix_names_every_command) {
  std::vector<std::string> names;
  for (const Row& row : kMatrix) names.emplace_back(row.command);
  EXPECT_EQ(names, command_names());
}

TEST_F(DeskTest, roles_and_baton_decide_as_the_matrix_says) {
  const std::uint64_t anna = take_baton(kAnna);
  for (const Row& row : kMatrix) {
    SCOPED_TRACE(row.command);
    const std::string name = row.command;
    const int passed_before = line_.submitted + line_.stops + line_.halts;
    EXPECT_FALSE(ask(kGone, named(name)).accepted());
    EXPECT_FALSE(ask(kGone, named(name, anna)).accepted());
    EXPECT_EQ(ask(kScreen, named(name, anna)).accepted(), row.observer_may);
    EXPECT_EQ(line_.submitted + line_.stops + line_.halts, passed_before);
    if (row.needs_baton) {
      // Without, with a made-up one, and with another's.
      EXPECT_NE(ask(kAnna, named(name)).words().find("needs the baton; anna holds"), std::string::npos);
      EXPECT_NE(ask(kAnna, named(name, anna + 1)).words().find("is stale"), std::string::npos);
      EXPECT_NE(ask(kBen, named(name, anna)).words().find("taken with another key"), std::string::npos);
      EXPECT_EQ(line_.submitted + line_.stops + line_.halts, passed_before);
    }
  }
  EXPECT_EQ(line_.motions, 0);
}

TEST_F(DeskTest, the_holder_passes_every_command_on_but_the_links_own) {
  const std::uint64_t anna = take_baton(kAnna);
  int expected = 0;
  for (const Row& row : kMatrix) {
    const std::string name = row.command;
    if (!row.needs_baton || name == "sign_of_life" || name == "give_baton") continue;
    EXPECT_TRUE(post(kAnna, named(name, anna).SerializeAsString()).empty()) << name;
    EXPECT_EQ(line_.submitted, ++expected) << name;
    EXPECT_EQ(line_.commands().back().what_case(), command_named(name).what_case());
  }
  EXPECT_EQ(expected, 10);
}

TEST_F(DeskTest, one_holder_at_a_time) {
  const std::uint64_t anna = take_baton(kAnna);
  EXPECT_EQ(anna, kFirst);
  const v1::Answer refused = ask(kBen, named("take_baton"));
  EXPECT_FALSE(refused.accepted());
  EXPECT_EQ(refused.baton(), 0U);
  EXPECT_NE(refused.words().find("anna holds the baton"), std::string::npos);
  EXPECT_FALSE(ask(kAnna, named("take_baton")).accepted()) << "not even its own holder twice";
  EXPECT_TRUE(ask(kAnna, named("give_baton", anna)).accepted());
  const std::uint64_t ben = take_baton(kBen);
  EXPECT_GT(ben, anna);
  EXPECT_NE(ask(kAnna, named("go", anna)).words().find("is stale; ben holds"), std::string::npos);
  EXPECT_EQ(line_.batons(), (std::vector<bool>{true, false, true}));
}

TEST_F(DeskTest, the_baton_lapses_after_its_time_and_its_number_is_stale) {
  const std::uint64_t anna = take_baton(kAnna);
  pass(kLapse);
  EXPECT_TRUE(desk_.baton().held());
  EXPECT_EQ(desk_.wake_ns(), now_ + 1);
  pass(1);
  EXPECT_FALSE(desk_.baton().held());
  EXPECT_EQ(line_.batons(), (std::vector<bool>{true, false}));
  const v1::Answer answer = ask(kAnna, named("go", anna));
  EXPECT_FALSE(answer.accepted());
  EXPECT_NE(answer.words().find("is stale; nobody holds"), std::string::npos) << answer.words();
  EXPECT_FALSE(ask(kAnna, named("sign_of_life", anna)).accepted());
  EXPECT_EQ(line_.motions, 0);
}

TEST_F(DeskTest, signs_of_life_keep_the_baton) {
  const std::uint64_t anna = take_baton(kAnna);
  for (int i = 0; i < 20; ++i) {
    pass(kLapse - kMs);
    EXPECT_TRUE(ask(kAnna, named("sign_of_life", anna)).accepted());
  }
  EXPECT_EQ(line_.batons(), (std::vector<bool>{true}));
}

TEST_F(DeskTest, a_command_that_waited_longer_than_the_lapse_is_not_passed_on_without_a_sign_of_life) {
  const std::uint64_t anna = take_baton(kAnna);
  now_ += 2 * kLapse;  // this thread was held up; judge() has not been called
  post(kAnna, named("go", anna).SerializeAsString());
  EXPECT_EQ(line_.motions, 0);
  EXPECT_EQ(line_.batons(), (std::vector<bool>{true, false}));
}

TEST_F(DeskTest, a_sign_of_life_that_had_arrived_counts_even_behind_other_commands) {
  const std::uint64_t anna = take_baton(kAnna);
  now_ += 2 * kLapse;
  std::vector<Mail> mails{
      Mail{Route{"r", false}, kAnna, named("go", anna).SerializeAsString(), true},
      Mail{Route{"r", false}, kAnna, named("sign_of_life", anna).SerializeAsString(), true}};
  desk_.serve(mails, now_);
  EXPECT_EQ(line_.motions, 1);
  EXPECT_EQ(line_.batons(), (std::vector<bool>{true}));
}

TEST_F(DeskTest, a_replayed_sign_of_life_does_not_renew) {
  const std::uint64_t anna = take_baton(kAnna);
  const v1::Command sign = named("sign_of_life", anna);
  EXPECT_TRUE(ask(kAnna, sign).accepted());
  now_ += kLapse;
  EXPECT_TRUE(ask(kAnna, sign).repeated());
  pass(1);
  EXPECT_FALSE(desk_.baton().held());
}

TEST_F(DeskTest, a_repeated_id_gets_the_first_answer_and_does_nothing) {
  const std::uint64_t anna = take_baton(kAnna);
  const v1::Command go = named("go", anna);
  EXPECT_TRUE(post(kAnna, go.SerializeAsString()).empty());
  v1::Answer done;
  done.set_accepted(true);
  done.set_words("walk 7 begins");
  desk_.answered(line_.tickets().at(0), done);
  const std::vector<Reply> first = taken();
  ASSERT_EQ(first.size(), 1U);
  EXPECT_EQ(first[0].answer.id(), go.id());
  EXPECT_FALSE(first[0].answer.repeated());
  for (int i = 0; i < 3; ++i) {
    const v1::Answer again = ask(kAnna, go);
    EXPECT_TRUE(again.accepted() && again.repeated());
    EXPECT_EQ(again.words(), "walk 7 begins");
  }
  // Also after the baton went: it is the first answer that is wanted.
  pass(2 * kLapse);
  EXPECT_TRUE(ask(kAnna, go).repeated());
  EXPECT_EQ(line_.motions, 1);
}

TEST_F(DeskTest, an_id_repeated_before_the_answer_waits_for_it_on_each_connection) {
  const std::uint64_t anna = take_baton(kAnna);
  const std::string go = named("go", anna).SerializeAsString();
  for (int i = 0; i < 10; ++i) {
    std::vector<Mail> mails{Mail{Route{"connection " + std::to_string(i), false}, kAnna, go, true}};
    desk_.serve(mails, now_);
  }
  EXPECT_TRUE(taken().empty());
  desk_.answered(line_.tickets().at(0), v1::Answer{});
  const std::vector<Reply> replies = taken();
  ASSERT_EQ(replies.size(), Recent::kMostWaiting);
  EXPECT_EQ(replies.back().route.id, "connection 9");
  desk_.answered(line_.tickets().at(0), v1::Answer{});
  EXPECT_TRUE(taken().empty()) << "one answer a ticket";
  EXPECT_EQ(line_.motions, 1);
}

TEST_F(DeskTest, an_id_used_again_for_another_command_is_refused_but_a_stop_stops) {
  const std::uint64_t anna = take_baton(kAnna);
  EXPECT_TRUE(post(kAnna, made(command_named("go"), "same", anna).SerializeAsString()).empty());
  const v1::Answer park = ask(kAnna, made(command_named("park"), "same", anna));
  EXPECT_FALSE(park.accepted());
  EXPECT_NE(park.words().find("new id"), std::string::npos);
  line_.confirms = true;
  line_.confirm_after_ns = 0;
  post(kAnna, made(command_named("stop"), "same").SerializeAsString());
  EXPECT_EQ(line_.stops, 1);
  pass(0);
  const std::vector<Reply> replies = taken();
  ASSERT_EQ(replies.size(), 1U);
  EXPECT_TRUE(replies[0].answer.confirmed());
}

TEST_F(DeskTest, ids_of_different_keys_do_not_meet) {
  line_.confirms = true;
  post(kAnna, made(command_named("stop"), "1").SerializeAsString());
  post(kBen, made(command_named("stop"), "1").SerializeAsString());
  EXPECT_EQ(line_.stops, 2);
}

TEST_F(DeskTest, memory_is_bounded_and_signs_of_life_do_not_push_the_rest_out) {
  const std::uint64_t anna = take_baton(kAnna);
  const v1::Command first = named("take_baton");
  EXPECT_FALSE(ask(kAnna, first).accepted());
  for (int i = 0; i < 20'000; ++i) (void)ask(kAnna, named("sign_of_life", anna));
  EXPECT_TRUE(ask(kAnna, first).repeated());
  for (int i = 0; i < 20'000; ++i) (void)ask(kAnna, named("take_baton"));
  EXPECT_FALSE(ask(kAnna, first).repeated()) << "forgotten by now: the journal knows";
}

TEST_F(DeskTest, nobody_pushes_out_what_is_remembered_of_another) {
  const std::uint64_t anna = take_baton(kAnna);
  const v1::Command go = named("go", anna);
  EXPECT_TRUE(post(kAnna, go.SerializeAsString()).empty());
  desk_.answered(line_.tickets().at(0), v1::Answer{});
  (void)taken();
  for (int i = 0; i < 20'000; ++i) (void)ask(kBen, named("go", anna));
  EXPECT_TRUE(ask(kAnna, go).repeated());
  EXPECT_EQ(line_.motions, 1);
}

TEST_F(DeskTest, a_full_queue_is_said_and_the_same_id_may_come_again) {
  const std::uint64_t anna = take_baton(kAnna);
  const v1::Command go = named("go", anna);
  line_.full = true;
  EXPECT_NE(ask(kAnna, go).words().find("try again"), std::string::npos);
  line_.full = false;
  EXPECT_TRUE(post(kAnna, go.SerializeAsString()).empty());
  EXPECT_EQ(line_.motions, 1);
}

TEST_F(DeskTest, a_session_that_never_answers_does_not_make_the_link_grow) {
  const std::uint64_t anna = take_baton(kAnna);
  int refused = 0;
  for (int i = 0; i < 1000; ++i) {
    for (const Reply& reply : post(kAnna, named("go", anna).SerializeAsString())) {
      refused += reply.answer.words().find("too many") != std::string::npos ? 1 : 0;
    }
  }
  EXPECT_EQ(line_.submitted, 256);
  EXPECT_EQ(refused, 744);
  post(kAnna, named("stop").SerializeAsString());
  EXPECT_EQ(line_.stops, 1);
}

TEST_F(DeskTest, a_stop_is_answered_when_confirmed_and_at_300_ms_otherwise) {
  const v1::Command stop = named("stop");
  EXPECT_TRUE(post(kAnna, stop.SerializeAsString()).empty());
  EXPECT_TRUE(desk_.stop_pending());
  EXPECT_EQ(desk_.wake_ns(), now_ + 300 * kMs);
  pass(299 * kMs);
  EXPECT_TRUE(taken().empty());
  pass(kMs);
  std::vector<Reply> replies = taken();
  ASSERT_EQ(replies.size(), 1U);
  EXPECT_FALSE(replies[0].answer.confirmed());
  EXPECT_EQ(replies[0].answer.words(),
            "stop is set, but the robot has NOT confirmed it within 300.0 ms: use the emergency stop");
  EXPECT_FALSE(desk_.stop_pending());
  line_.confirms = true;
  line_.confirm_after_ns = 0;
  EXPECT_TRUE(post(kAnna, named("halt").SerializeAsString()).empty());
  pass(1'250'000);
  replies = taken();
  ASSERT_EQ(replies.size(), 1U);
  EXPECT_EQ(replies[0].answer.words(),
            "halt confirmed: the robot has written a torque-free command, 1.2 ms after it was asked");
}

TEST_F(DeskTest, stops_are_served_before_everything_that_arrived_with_them) {
  const std::uint64_t anna = take_baton(kAnna);
  struct Order : ScriptedLine {
    bool submit(Ticket ticket, const v1::Command& command, const Asker& asker) override {
      stops_before_first_submit = submitted == 0 ? stops.load() : stops_before_first_submit;
      return ScriptedLine::submit(ticket, command, asker);
    }
    int stops_before_first_submit{0};
  } line;
  Desk desk(line, kLapse, kFirst);
  std::vector<Mail> take{Mail{Route{"r", false}, kAnna, named("take_baton").SerializeAsString(), true}};
  desk.serve(take, now_);
  std::vector<Mail> mails;
  for (int i = 0; i < 63; ++i) {
    mails.push_back(Mail{Route{"r", false}, kAnna, named("go", anna).SerializeAsString(), true});
  }
  mails.push_back(Mail{Route{"r", false}, kBen, named("stop").SerializeAsString(), true});
  desk.serve(mails, now_);
  EXPECT_EQ(line.submitted, 63);
  EXPECT_EQ(line.stops_before_first_submit, 1);
}

TEST_F(DeskTest, a_stop_inside_a_large_message_stops_too) {
  v1::Command stop = named("stop");
  // An unknown field, as a later version might have.
  stop.GetReflection()->MutableUnknownFields(&stop)->AddLengthDelimited(900, std::string(100'000, 'x'));
  post(kAnna, stop.SerializeAsString());
  EXPECT_EQ(line_.stops, 1);
}

TEST_F(DeskTest, ten_thousand_stops_at_once_are_bounded_and_all_answered) {
  int answered = 0;
  for (int i = 0; i < 10'000; ++i)
    answered += static_cast<int>(post(kAnna, named("stop").SerializeAsString()).size());
  pass(400 * kMs);
  EXPECT_EQ(answered + static_cast<int>(taken().size()), 10'000);
  EXPECT_EQ(line_.stops, 10'000);
}

TEST_F(DeskTest, ids_and_names_that_cannot_be_used_are_refused_in_words) {
  const auto words = [&](const std::function<void(v1::Command&)>& change) {
    v1::Command command = named("halt");
    change(command);
    const v1::Answer answer = ask(kAnna, command);
    EXPECT_FALSE(answer.accepted());
    EXPECT_EQ(answer.words().find('\n'), std::string::npos);
    return answer.words();
  };
  EXPECT_NE(words([](auto& c) { c.clear_id(); }).find("found an id of 0 bytes"), std::string::npos);
  EXPECT_NE(words([](auto& c) { c.set_id(std::string(65, 'a')); }).find("65 bytes"), std::string::npos);
  EXPECT_NE(words([](auto& c) { c.set_id("a\nb"); }).find("printable"), std::string::npos);
  EXPECT_NE(words([](auto& c) { c.set_operator_name(std::string(65, 'n')); }).find("name"),
            std::string::npos);
  EXPECT_NE(words([](auto& c) { c.set_operator_name("\x1b[2J"); }).find("name"), std::string::npos);
  EXPECT_NE(words([](auto& c) { c.set_format(2); }).find("format 2, expected 1"), std::string::npos);
  EXPECT_NE(words([](auto& c) { c.clear_halt(); }).find("no command"), std::string::npos);
  EXPECT_EQ(line_.halts, 0);
  v1::Command longest = named("halt");
  longest.set_id(std::string(64, 'i'));
  longest.set_operator_name(std::string(64, 'n'));
  post(kAnna, longest.SerializeAsString());
  EXPECT_EQ(line_.halts, 1);
}

// Garbage, truncations and bit flips of good commands, from a commander without the baton, while another
// holds it.
TEST_F(DeskTest, nothing_damaged_ever_moves_the_robot) {
  const std::uint64_t anna = take_baton(kAnna);
  std::mt19937_64 random(20260101);
  const std::vector<std::string> names = command_names();
  for (int i = 0; i < 100'000; ++i) {
    std::string bytes;
    if (i % 3 == 0) {
      bytes.resize(random() % 200);
      for (char& c : bytes) c = static_cast<char>(random());
    } else {
      bytes = named(names[random() % names.size()], anna).SerializeAsString();
      if (i % 3 == 1) {
        bytes.resize(random() % bytes.size());
      } else {
        for (std::uint64_t flips = 1 + random() % 4; flips > 0; --flips) {
          bytes[random() % bytes.size()] ^= static_cast<char>(1U << (random() % 8));
        }
      }
    }
    now_ += 1000;
    for (const Reply& reply : post(kBen, bytes))
      EXPECT_EQ(reply.answer.words().find('\n'), std::string::npos);
    if (i % 100 == 0) (void)ask(kAnna, named("sign_of_life", anna));
  }
  EXPECT_EQ(line_.motions, 0);
  EXPECT_EQ(line_.submitted, 0);
  EXPECT_EQ(line_.batons(), (std::vector<bool>{true}));
}

TEST_F(DeskTest, damaged_text_is_refused_without_a_word_on_stderr) {
  ::testing::internal::CaptureStderr();
  v1::Command command = named("halt");
  command.set_operator_name("anna");
  std::string bytes = command.SerializeAsString();
  bytes[bytes.find("anna")] = '\xff';
  const std::vector<Reply> replies = post(kAnna, bytes);
  ASSERT_EQ(replies.size(), 1U);
  EXPECT_FALSE(replies[0].answer.accepted());
  EXPECT_EQ(::testing::internal::GetCapturedStderr(), "");
}

TEST_F(DeskTest, the_status_says_who_holds_the_baton) {
  EXPECT_EQ(ask(kScreen, named("ask_status")).status().baton_holder(), "");
  (void)take_baton(kAnna);
  const v1::Answer answer = ask(kScreen, named("ask_status"));
  EXPECT_EQ(answer.status().baton_holder(), "anna");
  EXPECT_EQ(answer.status().robot(), "scripted");
}

}  // namespace
}  // namespace pastern::link
