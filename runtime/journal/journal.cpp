// Opening, creating and checking a journal; the one way to write to it.
#include "runtime/journal/journal.h"

#include <fcntl.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>

#include "runtime/journal/encoding.h"
#include "runtime/journal/impl.h"
#include "runtime/journal/schema_text.h"

namespace pastern::journal {
namespace {

constexpr const char* kFileName = "/pastern.journal";

// A message of SQLite as the end of our line: never more than one line.
std::string one_line(std::string words) {
  for (char& c : words)
    if (c == '\n' || c == '\r') c = ' ';
  return words;
}

bool is_folder(const std::string& path) {
  std::error_code ignored;
  return std::filesystem::is_directory(path, ignored);
}

int number_in(Database& database, const char* sql) {
  std::string answer;
  if (!database.ask(sql, answer) || answer.empty()) return -1;
  return std::stoi(answer);
}

// Empty when the file is a journal of a version we know; `fresh` when there is nothing in it yet.
std::string objection_to(Database& database, bool& fresh) {
  std::string tables;
  if (!database.ask("SELECT count(*) FROM sqlite_schema", tables)) {
    if ((database.code() & 0xFF) == SQLITE_NOTADB) return "not a journal: found another kind of file";
    if ((database.code() & 0xFF) == SQLITE_CORRUPT) return "damaged: " + database.message();
    return "cannot be read: " + database.message();
  }
  const int application = number_in(database, "PRAGMA application_id");
  fresh = tables == "0" && application == 0;
  if (fresh) return "";
  if (application != kApplicationId)
    return "not a journal: found application id " + std::to_string(application) + ", expected " +
           std::to_string(kApplicationId);
  const int version = number_in(database, "PRAGMA user_version");
  const std::string versions =
      "found schema version " + std::to_string(version) + ", expected " + std::to_string(kSchemaVersion);
  if (version < 1) return "not a journal: " + versions;
  if (version != kSchemaVersion)
    return std::string("written by ") + (version > kSchemaVersion ? "a newer" : "an older") +
           " program: " + versions + "; read it with that program, or begin a new journal in another folder";
  std::string verdict;
  if (!database.ask("PRAGMA quick_check(1)", verdict)) return "damaged: " + database.message();
  return verdict == "ok" ? "" : "damaged: " + verdict;
}

// First row of `sql` whose texts do not match its seal: the first column names the row, the last one is the
// seal.
std::string first_unsealed(Database& database, const char* sql) {
  Query query(database, sql);
  while (query.row()) {
    std::vector<std::string> texts;
    const int seal = query.columns() - 1;
    for (int column = 1; column < seal; ++column) texts.push_back(query.bytes(column));
    if (seal_of(texts) != query.bytes(seal)) return "damaged: " + query.bytes(0) + " does not match its seal";
  }
  return query.failed() ? "damaged: " + database.message() : "";
}

// SQLite itself would not notice a changed byte inside a value.
std::string objection_to_rows(Database& database) {
  for (const char* sql :
       {"SELECT 'session ' || session, plan_text, robot_sha256, start_policy_sha256, start_parameters_sha256,"
        " candidate_sha256, software, ended, verdict_message, seal FROM sessions",
        "SELECT 'walk ' || walk || ' of session ' || session, session, walk, episode_message, seal FROM "
        "walks",
        "SELECT 'carried state', bytes, seal FROM carried_state",
        "SELECT 'kept value ' || name, name, bytes, seal FROM kept_values",
        "SELECT 'adoption ' || adoption, policy_sha256, who, when_utc, words, seal FROM adoptions",
        "SELECT 'first start of ' || robot_sha256, robot_sha256, who, when_utc, seal FROM first_starts",
        "SELECT 'command ' || id, client_key, id, command_sha256, answer_message, seal FROM commands",
        "SELECT 'telemetry ' || sequence, sequence, telemetry_message, seal FROM telemetry",
        "SELECT 'note ' || note, session, words, seal FROM notes"}) {
    if (std::string words = first_unsealed(database, sql); !words.empty()) return words;
  }
  return "";
}

// SQLite takes a file of under 512 bytes for an empty one and fills a torn last page up with zeros. Where no
// log stands beside the file (a power cut leaves one), such a file has been cut short.
std::string objection_to_file(const std::string& path) {
  const auto size_of = [](const std::string& name) -> std::uintmax_t {
    std::error_code missing;
    const auto size = std::filesystem::file_size(name, missing);
    return missing ? 0 : size;
  };
  const std::uintmax_t size = size_of(path);
  if (size == 0 || size_of(path + "-wal") > 0 || size_of(path + "-journal") > 0) return "";
  std::string head(18, '\0');
  std::ifstream(path, std::ios::binary).read(head.data(), static_cast<std::streamsize>(head.size()));
  if (head.substr(0, 16) != std::string("SQLite format 3\0", 16))
    return "not a journal: found another kind of file";
  const auto at = [&](std::size_t i) { return static_cast<unsigned char>(head[i]); };
  const std::uintmax_t page = at(16) * 256U + at(17) == 1 ? 65536 : at(16) * 256U + at(17);
  if (page >= 512 && size % page == 0) return "";
  return "damaged: cut short, found " + std::to_string(size) + " bytes";
}

bool insert_session_zero(Database& database) {
  return Query(database,
               "INSERT INTO sessions (session, plan_text, robot_sha256, start_policy_sha256, words, seal)"
               " VALUES (0, '', '', '', 'walks outside sessions', ?)",
               seal_of({"", "", "", "", "", "", "0", ""}))
      .done();
}

bool create_schema(Database& database) {
  const bool made = database.run("BEGIN IMMEDIATE") && database.run(kSchemaText) &&
                    insert_session_zero(database) &&
                    database.run(("PRAGMA application_id = " + std::to_string(kApplicationId)).c_str()) &&
                    database.run(("PRAGMA user_version = " + std::to_string(kSchemaVersion)).c_str()) &&
                    database.run("COMMIT");
  if (!made) database.roll_back();
  return made;
}

// WAL: a commit is one sync, and tools may read during a session. FULL: the sync is before the answer.
// A short log, so that little is read again after a power cut.
bool make_durable(Database& database) {
  std::string mode;
  return database.ask("PRAGMA journal_mode = WAL", mode) && mode == "wal" &&
         database.run("PRAGMA synchronous = FULL") && database.run("PRAGMA wal_autocheckpoint = 64");
}

// A file in WAL mode on a read-only medium can be read when no log stands beside it.
bool open_for_reading(Database& database, const std::string& path, const std::string& vfs) {
  std::error_code ignored;
  const auto log_size = std::filesystem::file_size(path + "-wal", ignored);
  const bool log = !ignored && log_size > 0;
  const bool writable =
      ::faccessat(AT_FDCWD, std::filesystem::path(path).parent_path().c_str(), W_OK, AT_EACCESS) == 0;
  if (log || writable || !vfs.empty()) return database.open(path, SQLITE_OPEN_READONLY, vfs);
  std::string name;
  for (const char c : path)
    name += c == '?' ? "%3f" : c == '#' ? "%23" : c == '%' ? "%25" : std::string(1, c);
  return database.open("file:" + name + "?immutable=1", SQLITE_OPEN_READONLY | SQLITE_OPEN_URI, vfs);
}

}  // namespace

const std::string& Journal::Impl::fail(const std::string& what, const std::string& why) {
  if (failure.empty()) failure = path + ": " + what + ": " + one_line(why);
  return failure;
}

bool Journal::Impl::sound(const Query& query, const std::string& what) {
  if (query.failed()) fail(what, "not read: " + database.message());
  return !query.failed();
}

Written Journal::Impl::write(const std::string& what, const std::function<bool(std::string&)>& body) {
  if (!failure.empty()) return {false, failure};
  if (read_only)
    return {false, path + ": " + what + ": not written: the journal was opened for reading only"};
  std::string objection;
  if (database.run("BEGIN IMMEDIATE") && body(objection) && objection.empty() && database.run("COMMIT"))
    return {true, ""};
  if (objection.empty() && (database.code() & 0xFF) == SQLITE_CONSTRAINT) objection = database.message();
  database.roll_back();
  if (!objection.empty()) return {false, path + ": " + what + ": refused: " + one_line(objection)};
  return {false, fail(what, "not written: " + database.message())};
}

Journal::Journal() : impl_(std::make_unique<Impl>()) {}
Journal::~Journal() = default;

const std::string& Journal::failure() const { return impl_->failure; }

std::unique_ptr<Journal> Journal::open(const std::string& folder, std::string& error, const std::string& vfs,
                                       bool read_only) {
  std::unique_ptr<Journal> journal(new Journal);
  Impl& impl = *journal->impl_;
  impl.read_only = read_only;
  const bool folder_given = is_folder(folder);
  impl.path = folder_given ? folder + kFileName : folder;
  const auto refuse = [&](const std::string& words) {
    error = impl.path + ": " + one_line(words);
    return nullptr;
  };
  if (!folder_given && !read_only) return refuse("not a folder");
  if (!read_only && !impl.lock.take(folder, error)) return nullptr;

  Database& database = impl.database;
  if (const std::string words = objection_to_file(impl.path); !words.empty()) return refuse(words);
  const bool opened = read_only ? open_for_reading(database, impl.path, vfs)
                                : database.open(impl.path, SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE, vfs);
  if (!opened) return refuse("cannot be opened: " + database.message());
  sqlite3_busy_timeout(database.handle(), 2000);
  if (!database.run("PRAGMA foreign_keys = ON")) return refuse("cannot be opened: " + database.message());

  bool fresh = false;
  if (const std::string words = objection_to(database, fresh); !words.empty()) return refuse(words);
  if (read_only) {
    if (fresh) return refuse("not a journal: found an empty file");
  } else {
    if (sqlite3_db_readonly(database.handle(), "main") != 0) return refuse("may not be written");
    if (!make_durable(database) || (fresh && !create_schema(database)))
      return refuse("cannot be written: " + database.message());
    if (fresh && !sync_folder(folder, error)) return nullptr;
  }
  if (const std::string words = objection_to_rows(database); !words.empty()) return refuse(words);
  return journal;
}

std::string Journal::snapshot() const {
  sqlite3_int64 size = 0;
  unsigned char* bytes = sqlite3_serialize(impl_->database.handle(), "main", &size, 0);
  if (bytes == nullptr || size < 100) {
    sqlite3_free(bytes);
    return "";
  }
  // File format, bytes 18 and 19: 2 is WAL, 1 a plain file (sqlite.org/fileformat2.html sec. 1.3.3).
  bytes[18] = 1;
  bytes[19] = 1;
  std::string copy(reinterpret_cast<const char*>(bytes), static_cast<std::size_t>(size));
  sqlite3_free(bytes);
  return copy;
}

}  // namespace pastern::journal
