// What the journal's source files share. Private to this folder.
#pragma once

#include <functional>
#include <string>

#include "runtime/journal/database.h"
#include "runtime/journal/folder_lock.h"
#include "runtime/journal/journal.h"

namespace pastern::journal {

/// "PAT1": PRAGMA application_id of a journal.
inline constexpr int kApplicationId = 0x50415431;
/// PRAGMA user_version of schema.sql.
inline constexpr int kSchemaVersion = 2;

struct Journal::Impl {
  FolderLock lock;  // before the database: dropped after it is closed
  Database database;
  std::string path;
  bool read_only{false};
  std::string failure;

  /// One transaction. `body` returns false when a statement failed, or with `objection` set when the change
  /// is refused (nothing is written, the journal stays sound). `what` for the words: "walk 7".
  [[nodiscard]] Written write(const std::string& what,
                              const std::function<bool(std::string& objection)>& body);
  /// The single statement's form of it.
  template <class... Values>
  [[nodiscard]] Written write_one(const std::string& what, const char* sql, const Values&... values) {
    return write(what, [&](std::string&) { return Query(database, sql, values...).done(); });
  }
  /// Latches the first failure and returns its words.
  const std::string& fail(const std::string& what, const std::string& why);
  /// First column of the first row; nothing when there is none, or when it failed (latched).
  [[nodiscard]] std::optional<std::string> one_value(Query& query, const std::string& what);
  /// True when the query ended without failure; latches otherwise.
  bool sound(const Query& query, const std::string& what);
};

}  // namespace pastern::journal
