// The schema as another program sees it: through the sqlite3 shell, by the documented names.
#include <gtest/gtest.h>
#include <unistd.h>

#include <array>
#include <cctype>
#include <cstdio>
#include <fstream>
#include <sstream>

#include "tests/runtime/journal/support.h"

namespace pastern::journal {
namespace {

std::string shell(const std::string& file, const std::string& sql) {
  const std::string command = "sqlite3 -readonly '" + file + "' \"" + sql + "\" 2>&1";
  FILE* const pipe = popen(command.c_str(), "r");
  std::string answer;
  std::array<char, 4096> buffer{};
  while (pipe != nullptr && std::fgets(buffer.data(), buffer.size(), pipe) != nullptr)
    answer += buffer.data();
  return pipe != nullptr && pclose(pipe) == 0 ? answer : "failed: " + answer;
}

TEST(Schema, TheSqliteShellReadsAWalkByItsDocumentedColumnsDuringASession) {
  const Folder folder;
  const auto journal = opened(folder);
  begun(*journal);
  v1::Episode fell = episode(1, 1);
  fell.set_outcome(v1::FELL);
  fell.mutable_terms()->set_fall(-1);
  walk(*journal, fell);
  walk(*journal, episode(1, 2));
  EXPECT_EQ(
      shell(folder.file(),
            "SELECT session, walk, part, batch, place, outcome, return_total, return_forward, return_energy,"
            " return_drift, return_turn, return_fall, distance_m FROM walks ORDER BY walk"),
      "1|1|search|3|1|fell|0.8125|2.5|-0.5|-0.125|-0.0625|-1.0|3.5\n"
      "1|2|search|3|2|completed|1.8125|2.5|-0.5|-0.125|-0.0625|0.0|3.5\n");
  EXPECT_EQ(shell(folder.file(), "SELECT count, length(bytes) FROM parameters"), "4|32\n");
  EXPECT_EQ(shell(folder.file(),
                  "PRAGMA application_id; PRAGMA user_version; PRAGMA foreign_key_check;"
                  " PRAGMA integrity_check"),
            "1346458673\n2\nok\n");
}

TEST(Schema, EveryColumnOfTheDocumentIsThereAndNoOther) {
  const Folder folder;
  const auto journal = opened(folder);
  std::ifstream document(std::string(PASTERN_SOURCE_DIR) + "/runtime/journal/schema.sql");
  std::string line;
  std::string table;
  std::string documented;
  while (std::getline(document, line)) {
    std::istringstream words(line);
    std::string first;
    std::string second;
    std::string third;
    words >> first >> second >> third;
    if (first == "CREATE" && second == "TABLE") table = third;
    const std::string type = second.substr(0, second.find(','));
    const bool column = line.rfind("  ", 0) == 0 && std::islower(static_cast<unsigned char>(first[0])) != 0;
    if (column && (type == "INTEGER" || type == "TEXT" || type == "REAL" || type == "BLOB"))
      documented += table + "|" + first + "|" + type + "\n";
  }
  EXPECT_GT(documented.size(), 1000U);
  EXPECT_EQ(shell(folder.file(),
                  "SELECT m.name, c.name, c.type FROM sqlite_schema m JOIN pragma_table_info(m.name) c"
                  " WHERE m.type = 'table' ORDER BY m.rowid, c.cid"),
            documented);
}

TEST(Schema, TheJournalIsInWalModeWithFullSync) {
  const Folder folder;
  const auto journal = opened(folder);
  EXPECT_EQ(shell(folder.file(), "PRAGMA journal_mode"), "wal\n");
}

}  // namespace
}  // namespace pastern::journal
