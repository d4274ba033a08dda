// What the journal gives back: after reopening, in order, to the byte.
#include "runtime/journal/journal.h"

#include <gtest/gtest.h>
#include <unistd.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <limits>

#include "proto/files/sha256.h"
#include "tests/runtime/journal/support.h"

namespace pastern::journal {
namespace {

v1::Verdict adopt_verdict() {
  v1::Verdict verdict;
  verdict.set_kind(v1::Verdict::ADOPT);
  verdict.set_p_value(0.0078125);
  verdict.set_pairs(8);
  verdict.set_effect(0.5);
  verdict.set_effect_low(-std::numeric_limits<double>::infinity());
  verdict.set_words("adopt");
  return verdict;
}

TEST(Journal, NewOneIsEmpty) {
  const Folder folder;
  const auto journal = opened(folder);
  EXPECT_FALSE(journal->last_session().has_value());
  EXPECT_TRUE(journal->sessions().empty());
  EXPECT_TRUE(journal->finished(1).empty());
  EXPECT_EQ(journal->last_walk(1), 0U);
  EXPECT_FALSE(journal->robot_state().has_value());
  EXPECT_FALSE(journal->get("windings").has_value());
  EXPECT_TRUE(journal->adoptions().empty());
  EXPECT_EQ(journal->last_sequence(), 0U);
  EXPECT_TRUE(journal->telemetry(0, ~std::uint64_t{0}).empty());
  EXPECT_EQ(journal->digest(1), "");
  EXPECT_EQ(journal->failure(), "");
}

TEST(Journal, FinishedWalksComeBackToTheByteAfterReopening) {
  const Folder folder;
  std::vector<std::string> committed;
  {
    const auto journal = opened(folder);
    const SessionRow row = begun(*journal);
    EXPECT_EQ(row.session, 1U);
    for (std::uint64_t n = 1; n <= 5; ++n) walk(*journal, episode(1, n, 0.1 * static_cast<double>(n)));
    for (const auto& f : journal->finished(1)) committed.push_back(f.episode.SerializeAsString());
  }
  const auto journal = opened(folder);
  const auto finished = journal->finished(1);
  ASSERT_EQ(finished.size(), 5U);
  for (std::size_t i = 0; i < 5; ++i) {
    EXPECT_EQ(finished[i].episode.SerializeAsString(), committed[i]);
    EXPECT_EQ(finished[i].episode.draw(), 0xFFFFFFFFFFFFFFF1U + i);
    const Evaluation& e = finished[i].evaluation.value();
    EXPECT_EQ(e.batch, 3U);
    EXPECT_EQ(e.index, i + 1);
    EXPECT_EQ(e.outcome, Outcome::completed);
    EXPECT_DOUBLE_EQ(e.terms.total(), 0.1 * static_cast<double>(i + 1) - 0.6875);
    EXPECT_DOUBLE_EQ(finished[i].episode.terms().total(), e.terms.total());
    EXPECT_EQ(journal->parameters(finished[i].episode.parameters_sha256()), kParameters);
  }
  EXPECT_EQ(journal->last_walk(1), 5U);
  EXPECT_EQ(journal->robot_state(), "state 5");
  const auto row = journal->last_session();
  ASSERT_TRUE(row.has_value());
  EXPECT_EQ(row->plan_text, "name: \"morning\"");
  EXPECT_EQ(row->start_parameters_sha256_hex, std::string(64, 'c'));
  EXPECT_FALSE(row->ended);
}

TEST(Journal, ParametersAreFoundByRawSumAndByHexAndSurviveTheirExtremes) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  const Parameters odd{-0.0, 5e-324, 1.7976931348623157e308, std::numeric_limits<double>::infinity()};
  walk(*journal, episode(1, 1), odd);
  walk(*journal, episode(1, 2), Parameters{});
  const std::string sum = parameters_sha256(odd);
  EXPECT_EQ(journal->parameters(sum), odd);
  EXPECT_TRUE(std::signbit(journal->parameters(files::hex(std::string_view(sum)))->front()));
  EXPECT_EQ(journal->parameters(parameters_sha256({})), Parameters{});
  EXPECT_FALSE(journal->parameters(std::string(32, 'x')).has_value());
  EXPECT_FALSE(journal->parameters("").has_value());
}

TEST(Journal, AReturnThatIsNoNumberIsKeptAsItIs) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  walk(*journal, episode(1, 1, std::nan("")));
  walk(*journal, episode(1, 2, -std::numeric_limits<double>::infinity()));
  EXPECT_TRUE(std::isnan(journal->finished(1)[0].evaluation.value().terms.total()));
  EXPECT_TRUE(std::isinf(journal->finished(1)[1].evaluation.value().terms.total()));
}

TEST(Journal, AWalkOutOfTurnIsRefusedAndTheJournalStaysSound) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  walk(*journal, episode(1, 1));
  std::string why;
  for (const std::uint64_t wrong :
       {std::uint64_t{0}, std::uint64_t{1}, std::uint64_t{3}, ~std::uint64_t{0}}) {
    EXPECT_FALSE(journal->commit(episode(1, wrong), kParameters, "", why).has_value());
    EXPECT_NE(why.find("expected walk 2"), std::string::npos) << why;
  }
  EXPECT_FALSE(journal->commit(episode(9, 1), kParameters, "", why).has_value()) << "no such session";
  v1::Episode unsaid = episode(1, 2);
  unsaid.clear_outcome();
  EXPECT_FALSE(journal->commit(unsaid, kParameters, "", why).has_value());
  unsaid = episode(1, 2);
  unsaid.clear_part();
  EXPECT_FALSE(journal->commit(unsaid, kParameters, "", why).has_value());
  EXPECT_EQ(journal->failure(), "");
  walk(*journal, episode(1, 2));
  EXPECT_EQ(journal->robot_state(), "state 2");
}

TEST(Journal, VoidMarkTurnsTheLastFinishedWalkOnly) {
  const Folder folder;
  {
    const auto journal = opened(folder);
    begun(*journal);
    EXPECT_FALSE(journal->mark_void(1, 0, "none").ok);
    walk(*journal, episode(1, 1));
    walk(*journal, episode(1, 2));
    EXPECT_FALSE(journal->mark_void(1, 1, "too late").ok);
    EXPECT_FALSE(journal->mark_void(1, 3, "not walked").ok);
    EXPECT_FALSE(journal->mark_void(2, 2, "no such session").ok);
    EXPECT_TRUE(journal->mark_void(1, 2, "somebody bumped it").ok);
    EXPECT_NE(journal->mark_void(1, 2, "again").words.find("void already"), std::string::npos);
    walk(*journal, episode(1, 3));
  }
  const auto journal = opened(folder);
  const auto finished = journal->finished(1);
  ASSERT_EQ(finished.size(), 3U);
  EXPECT_EQ(finished[0].evaluation.value().outcome, Outcome::completed);
  EXPECT_EQ(finished[1].evaluation.value().outcome, Outcome::voided);
  EXPECT_EQ(finished[1].episode.void_reason(), "somebody bumped it");
  EXPECT_DOUBLE_EQ(finished[1].episode.terms().forward(), 2.5) << "what it was stays on record";
}

TEST(Journal, ASessionEndsOnceAndTakesNothingAfterwards) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  walk(*journal, episode(1, 1));
  EXPECT_FALSE(journal->verdict(1).has_value());
  EXPECT_FALSE(journal->end_session(1, v1::Verdict{}).ok) << "no verdict";
  EXPECT_FALSE(journal->end_session(7, adopt_verdict()).ok) << "no such session";
  EXPECT_FALSE(journal->end_session(0, adopt_verdict()).ok);
  EXPECT_TRUE(journal->end_session(1, adopt_verdict()).ok);
  EXPECT_FALSE(journal->end_session(1, adopt_verdict()).ok);
  EXPECT_EQ(journal->verdict(1)->SerializeAsString(), adopt_verdict().SerializeAsString());
  std::string why;
  EXPECT_FALSE(journal->commit(episode(1, 2), kParameters, "", why).has_value());
  EXPECT_FALSE(journal->mark_void(1, 1, "late").ok);
  EXPECT_TRUE(journal->last_session()->ended);
  EXPECT_EQ(begun(*journal).session, 2U);
  EXPECT_EQ(journal->sessions().size(), 2U);
  EXPECT_EQ(journal->failure(), "");
}

TEST(Journal, WalksOutsideSessionsHaveNumbersOfTheirOwn) {
  const Folder folder;
  const auto journal = opened(folder);
  walk(*journal, episode(0, 1));
  begun(*journal);
  walk(*journal, episode(1, 1));
  walk(*journal, episode(0, 2));
  EXPECT_EQ(journal->last_walk(0), 2U);
  EXPECT_EQ(journal->last_walk(1), 1U);
  EXPECT_EQ(journal->last_session()->session, 1U);
}

TEST(Journal, CarriedStateStaysWhenAWalkBringsNone) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  walk(*journal, episode(1, 1));
  std::string why;
  ASSERT_TRUE(journal->commit(episode(1, 2), kParameters, "", why).has_value()) << why;
  EXPECT_EQ(journal->robot_state(), "state 1");
}

TEST(Journal, PoliciesActsAndValuesComeBackAfterReopening) {
  const Folder folder;
  const std::string bytes("policy\0bytes", 12);
  const std::string sum = files::hex(files::sha256(bytes));
  {
    const auto journal = opened(folder);
    EXPECT_FALSE(journal->adopt({sum, "anna", "t1", "first"}).ok) << "not stored yet";
    EXPECT_FALSE(journal->store_policy(bytes, std::string(64, '0')).ok) << "another sum";
    EXPECT_TRUE(journal->store_policy(bytes, sum).ok);
    EXPECT_TRUE(journal->store_policy(bytes, sum).ok);
    EXPECT_TRUE(journal->adopt({sum, "anna", "t1", "first"}).ok);
    EXPECT_TRUE(journal->adopt({sum, "boris", "t2", "back"}).ok);
    EXPECT_TRUE(journal->confirm_first_start({"robot", "anna", "t0"}).ok);
    EXPECT_TRUE(journal->confirm_first_start({"robot", "boris", "t9"}).ok);  // the first one stands
    EXPECT_TRUE(journal->put("windings", "old").ok);
    EXPECT_TRUE(journal->put("windings", std::string("\0new", 4)).ok);
    EXPECT_TRUE(journal->note(0, "tripped: tilt").ok);
    EXPECT_TRUE(journal->note(0, "released").ok);
  }
  const auto journal = opened(folder);
  EXPECT_EQ(journal->policy(sum), bytes);
  EXPECT_FALSE(journal->policy("").has_value());
  ASSERT_EQ(journal->adoptions().size(), 2U);
  EXPECT_EQ(journal->adoptions()[1].who, "boris");
  EXPECT_EQ(journal->first_start("robot")->who, "anna");
  EXPECT_FALSE(journal->first_start("another").has_value());
  EXPECT_EQ(journal->get("windings"), std::string("\0new", 4));
  EXPECT_EQ(journal->notes(0), (std::vector<std::string>{"tripped: tilt", "released"}));
}

TEST(Journal, ACommandIsRememberedOnceAKeyAndKeepsItsFirstAnswer) {
  const Folder folder;
  {
    const auto journal = opened(folder);
    EXPECT_FALSE(journal->command("ida", "id 1").has_value());
    EXPECT_TRUE(journal->remember_command({"ida", "id 1", "aa", "first answer"}).ok);
    EXPECT_FALSE(journal->remember_command({"ida", "id 1", "aa", "second answer"}).ok);
    EXPECT_FALSE(journal->command("ole", "id 1").has_value());
    EXPECT_TRUE(journal->remember_command({"ole", "id 1", "bb", "another's answer"}).ok);
    EXPECT_EQ(journal->failure(), "");
  }
  const auto journal = opened(folder);
  EXPECT_EQ(journal->command("ida", "id 1")->answer, "first answer");
  EXPECT_EQ(journal->command("ida", "id 1")->command_sha256_hex, "aa");
  EXPECT_EQ(journal->command("ole", "id 1")->answer, "another's answer");
  EXPECT_FALSE(journal->command("", "id 1").has_value());
}

TEST(Journal, TelemetryIsFetchedBySequence) {
  const Folder folder;
  const auto journal = opened(folder);
  for (std::uint64_t n : {3U, 4U, 7U}) {
    v1::Telemetry telemetry;
    telemetry.set_sequence(n);
    telemetry.set_note("note " + std::to_string(n));
    EXPECT_TRUE(journal->store_telemetry(telemetry).ok);
    EXPECT_FALSE(journal->store_telemetry(telemetry).ok) << "twice";
  }
  EXPECT_EQ(journal->last_sequence(), 7U);
  ASSERT_EQ(journal->telemetry(4, ~std::uint64_t{0}).size(), 2U);
  EXPECT_EQ(journal->telemetry(4, 6)[0].note(), "note 4");
  EXPECT_TRUE(journal->telemetry(~std::uint64_t{0}, 5).empty());
  EXPECT_TRUE(journal->telemetry(5, 4).empty());
}

std::string digest_with(const std::function<void(Journal&)>& session) {
  const Folder folder;
  const auto journal = opened(folder);
  session(*journal);
  return journal->digest(journal->last_session()->session);
}

TEST(Digest, DependsOnWhatWasDoneNotOnWhenOrHowOften) {
  const auto plain = [](Journal& journal) {
    const auto number = begun(journal).session;
    for (std::uint64_t n = 1; n <= 3; ++n) walk(journal, episode(number, n));
    EXPECT_TRUE(journal.end_session(number, adopt_verdict()).ok);
  };
  const std::string digest = digest_with(plain);
  EXPECT_EQ(digest.size(), 64U);
  EXPECT_EQ(digest_with(plain), digest);
  EXPECT_EQ(digest_with([&](Journal& journal) {  // as the second session, with notes and other rows around
              begun(journal);
              EXPECT_TRUE(journal.note(2, "resumed").ok);
              EXPECT_TRUE(journal.put("windings", "warm").ok);
              plain(journal);
            }),
            digest);
}

TEST(Digest, ChangesWithEveryResult) {
  const auto with = [](const std::function<void(v1::Episode&)>& change, const Parameters& parameters,
                       bool ended) {
    return digest_with([&](Journal& journal) {
      begun(journal);
      v1::Episode e = episode(1, 1);
      change(e);
      walk(journal, e, parameters);
      if (ended) {
        EXPECT_TRUE(journal.end_session(1, adopt_verdict()).ok);
      }
    });
  };
  std::vector<std::string> digests{
      with([](v1::Episode&) {}, kParameters, false),
      with([](v1::Episode&) {}, kParameters, true),
      with([](v1::Episode&) {}, Parameters{1.0, -2.5, 0.1, 2e-300}, false),
      with([](v1::Episode& e) { e.mutable_terms()->set_turn(-0.0625 - 1e-17); }, kParameters, false),
      with([](v1::Episode& e) { e.set_outcome(v1::FELL); }, kParameters, false),
      with([](v1::Episode& e) { e.set_part(v1::BASELINE); }, kParameters, false),
      with([](v1::Episode& e) { e.set_index(9); }, kParameters, false),
      with([](v1::Episode& e) { e.set_draw(9); }, kParameters, false)};
  std::sort(digests.begin(), digests.end());
  EXPECT_EQ(std::adjacent_find(digests.begin(), digests.end()), digests.end());
}

TEST(Snapshot, IsAJournalThatOpensReadOnlyAnywhere) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  for (std::uint64_t n = 1; n <= 30; ++n) walk(*journal, episode(1, n));
  const std::string bytes = journal->snapshot();
  const std::string copy = folder.path() + "/copy.journal";
  FILE* const file = std::fopen(copy.c_str(), "wb");
  ASSERT_EQ(std::fwrite(bytes.data(), 1, bytes.size(), file), bytes.size());
  std::fclose(file);
  std::string error;
  const auto read = Journal::open(copy, error, "", true);
  ASSERT_NE(read, nullptr) << error;
  EXPECT_EQ(read->finished(1).size(), 30U);
  EXPECT_EQ(read->digest(1), journal->digest(1));
  SessionRow row;
  EXPECT_NE(read->begin_session(row).words.find("reading only"), std::string::npos);
  EXPECT_FALSE(std::filesystem::exists(copy + "-wal"));
}

}  // namespace
}  // namespace pastern::journal
