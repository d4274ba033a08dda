// SQLite behind the thin layer. Bound memory is copied: nothing outlives a call.
#include "runtime/journal/database.h"

namespace pastern::journal {

Database::~Database() {
  for (const auto& entry : prepared_) sqlite3_finalize(entry.second);
  sqlite3_close(handle_);
}

bool Database::remember(int code) {
  if (code == SQLITE_OK) return true;
  code_ = handle_ != nullptr ? sqlite3_extended_errcode(handle_) : code;
  message_ = handle_ != nullptr ? sqlite3_errmsg(handle_) : sqlite3_errstr(code);
  if (code_ == SQLITE_OK) {  // a call that failed without touching the connection
    code_ = code;
    message_ = sqlite3_errstr(code);
  }
  return false;
}

bool Database::open(const std::string& path, int flags, const std::string& vfs) {
  return remember(sqlite3_open_v2(path.c_str(), &handle_, flags | SQLITE_OPEN_EXRESCODE,
                                  vfs.empty() ? nullptr : vfs.c_str()));
}

bool Database::run(const char* sql) {
  return remember(sqlite3_exec(handle_, sql, nullptr, nullptr, nullptr));
}

bool Database::ask(const char* sql, std::string& answer) {
  Query query(*this, sql);
  if (!query.row()) return false;
  answer = query.bytes(0);
  return true;
}

void Database::roll_back() {
  if (handle_ == nullptr || sqlite3_get_autocommit(handle_) != 0) return;
  // Its failure changes nothing: the connection takes no further writes after one.
  (void)sqlite3_exec(handle_, "ROLLBACK", nullptr, nullptr, nullptr);
}

sqlite3_stmt* Database::prepared(const char* sql) {
  const auto found = prepared_.find(sql);
  if (found != prepared_.end()) return found->second;
  sqlite3_stmt* statement = nullptr;
  if (!remember(sqlite3_prepare_v3(handle_, sql, -1, SQLITE_PREPARE_PERSISTENT, &statement, nullptr)))
    return nullptr;
  prepared_.emplace(sql, statement);
  return statement;
}

Query::~Query() {
  if (statement_ == nullptr) return;
  (void)sqlite3_reset(statement_);  // repeats the code of the step, which has been looked at
  sqlite3_clear_bindings(statement_);
}

void Query::check(int code) {
  if (code == SQLITE_OK) return;
  database_.remember(code);
  failed_ = true;
}

bool Query::row() {
  if (statement_ == nullptr) failed_ = true;
  if (failed_) return false;
  const int code = sqlite3_step(statement_);
  if (code == SQLITE_ROW) return true;
  if (code != SQLITE_DONE) check(code);
  return false;
}

std::string Query::bytes(int column) const {
  const void* start = sqlite3_column_blob(statement_, column);
  const int size = sqlite3_column_bytes(statement_, column);
  if (start == nullptr || size <= 0) return {};
  return {static_cast<const char*>(start), static_cast<std::size_t>(size)};
}

void Query::bind(int place, std::int64_t value) {
  if (statement_ != nullptr) check(sqlite3_bind_int64(statement_, place, value));
}
void Query::bind(int place, double value) {
  if (statement_ != nullptr) check(sqlite3_bind_double(statement_, place, value));
}
void Query::bind(int place, std::string_view text) {
  if (statement_ != nullptr)
    check(sqlite3_bind_text64(statement_, place, text.data() != nullptr ? text.data() : "", text.size(),
                              SQLITE_TRANSIENT, SQLITE_UTF8));
}
void Query::bind(int place, Blob blob) {
  if (statement_ == nullptr) return;
  check(blob.bytes.empty()
            ? sqlite3_bind_zeroblob(statement_, place, 0)
            : sqlite3_bind_blob64(statement_, place, blob.bytes.data(), blob.bytes.size(), SQLITE_TRANSIENT));
}
void Query::bind(int place, std::nullptr_t) {
  if (statement_ != nullptr) check(sqlite3_bind_null(statement_, place));
}

}  // namespace pastern::journal
