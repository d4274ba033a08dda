// A thin layer over SQLite's C interface: a connection with prepared statements, and one query at a time.
// Private to this folder. No exceptions; every result code is looked at. One thread.
#pragma once

#include <sqlite3.h>

#include <cstddef>
#include <cstdint>
#include <string>
#include <string_view>
#include <unordered_map>

namespace pastern::journal {

/// Bytes, to be bound as BLOB (a string_view is bound as TEXT).
struct Blob {
  std::string_view bytes;
};

class Database {
 public:
  Database() = default;
  ~Database();
  Database(const Database&) = delete;
  Database& operator=(const Database&) = delete;

  /// `vfs` empty: the default one. False: message().
  [[nodiscard]] bool open(const std::string& path, int flags, const std::string& vfs);
  /// One or more statements without results.
  [[nodiscard]] bool run(const char* sql);
  /// First column of the first row as text; false when there is none or it failed.
  [[nodiscard]] bool ask(const char* sql, std::string& answer);
  /// Ends an open transaction without its changes; the message of the failure before it is kept.
  void roll_back();

  /// Extended result code of the last failure, and its words.
  [[nodiscard]] int code() const { return code_; }
  [[nodiscard]] const std::string& message() const { return message_; }

  [[nodiscard]] sqlite3* handle() const { return handle_; }

 private:
  friend class Query;
  [[nodiscard]] sqlite3_stmt* prepared(const char* sql);
  bool remember(int code);

  sqlite3* handle_{nullptr};
  std::unordered_map<std::string_view, sqlite3_stmt*> prepared_;
  int code_{SQLITE_OK};
  std::string message_;
};

/// One run of a prepared statement; reset when it goes out of scope. `sql` must be a literal.
class Query {
 public:
  template <class... Values>
  Query(Database& database, const char* sql, const Values&... values)
      : database_(database), statement_(database.prepared(sql)) {
    int place = 0;
    (bind(++place, values), ...);
  }
  ~Query();
  Query(const Query&) = delete;
  Query& operator=(const Query&) = delete;

  /// True while there is a row. After false, failed() tells the end from a failure.
  [[nodiscard]] bool row();
  [[nodiscard]] bool failed() const { return failed_; }
  /// For statements without rows.
  [[nodiscard]] bool done() { return !row() && !failed_; }

  [[nodiscard]] std::int64_t integer(int column) const { return sqlite3_column_int64(statement_, column); }
  [[nodiscard]] int columns() const { return sqlite3_column_count(statement_); }
  /// TEXT or BLOB, copied; a number as SQLite writes it; empty for NULL.
  [[nodiscard]] std::string bytes(int column) const;

 private:
  void bind(int place, std::int64_t value);
  void bind(int place, std::uint64_t value) { bind(place, static_cast<std::int64_t>(value)); }
  void bind(int place, std::uint32_t value) { bind(place, static_cast<std::int64_t>(value)); }
  void bind(int place, double value);
  void bind(int place, std::string_view text);
  void bind(int place, const std::string& text) { bind(place, std::string_view(text)); }
  void bind(int place, const char* text) { bind(place, std::string_view(text)); }
  void bind(int place, Blob blob);
  void bind(int place, std::nullptr_t nothing);
  void check(int code);

  Database& database_;
  sqlite3_stmt* statement_;
  bool failed_{false};
};

}  // namespace pastern::journal
