// The disk in memory behind PowerCutDisk, and its SQLite face.
#include "tests/faults/power_cut_vfs.h"

#include <sqlite3.h>

#include <algorithm>
#include <cstring>
#include <map>
#include <memory>
#include <random>
#include <utility>
#include <vector>

namespace pastern::faults {
namespace {

constexpr const char* kName = "pastern_power_cut";
constexpr std::size_t kSector = 512;

// A write, or (truncate) a change of size to `at`.
struct Change {
  bool truncate{false};
  std::size_t at{0};
  std::string bytes;
};

struct Content {
  std::string durable;
  bool exists_durably{false};
  std::string present;  // what a reader sees while the power is on
  std::vector<Change> unsynced;
};

struct Disk {
  std::map<std::string, std::shared_ptr<Content>> files;
  std::map<std::string, std::shared_ptr<Content>> removed;  // since the last sync
  std::uint64_t syncs{0};
  std::uint64_t cut{0};
  bool dead{false};
};

Disk g_disk;

struct File {
  sqlite3_file base;
  Content* content;
  std::vector<std::unique_ptr<std::vector<char>>>* shared;
};

struct Held {  // what a File points to must outlive removal by name
  std::shared_ptr<Content> content;
  std::vector<std::unique_ptr<std::vector<char>>> shared;
};
std::map<sqlite3_file*, Held> g_held;

Content& content(sqlite3_file* file) { return *reinterpret_cast<File*>(file)->content; }

void apply(std::string& to, const Change& change, char hole) {
  if (change.truncate) {
    to.resize(change.at, hole);
    return;
  }
  if (to.size() < change.at + change.bytes.size()) to.resize(change.at + change.bytes.size(), hole);
  to.replace(change.at, change.bytes.size(), change.bytes);
}

int close_file(sqlite3_file* file) {
  g_held.erase(file);
  return SQLITE_OK;
}

int read_file(sqlite3_file* file, void* to, int size, sqlite3_int64 at) {
  if (g_disk.dead) return SQLITE_IOERR_READ;
  const std::string& bytes = content(file).present;
  const auto from = std::min(static_cast<std::size_t>(at), bytes.size());
  const std::size_t count = std::min(static_cast<std::size_t>(size), bytes.size() - from);
  std::memcpy(to, bytes.data() + from, count);
  if (count == static_cast<std::size_t>(size)) return SQLITE_OK;
  std::memset(static_cast<char*>(to) + count, 0, static_cast<std::size_t>(size) - count);
  return SQLITE_IOERR_SHORT_READ;
}

int change_file(sqlite3_file* file, Change change) {
  if (g_disk.dead) return SQLITE_IOERR_WRITE;
  apply(content(file).present, change, '\0');
  content(file).unsynced.push_back(std::move(change));
  return SQLITE_OK;
}

int write_file(sqlite3_file* file, const void* from, int size, sqlite3_int64 at) {
  return change_file(file, {false, static_cast<std::size_t>(at),
                            std::string(static_cast<const char*>(from), static_cast<std::size_t>(size))});
}

int truncate_file(sqlite3_file* file, sqlite3_int64 size) {
  return change_file(file, {true, static_cast<std::size_t>(size), ""});
}

int sync_file(sqlite3_file* file, int) {
  if (g_disk.dead) return SQLITE_IOERR_FSYNC;
  if (++g_disk.syncs == g_disk.cut) {
    g_disk.dead = true;
    return SQLITE_IOERR_FSYNC;
  }
  Content& synced = content(file);
  synced.durable = synced.present;
  synced.exists_durably = true;
  synced.unsynced.clear();
  g_disk.removed.clear();
  return SQLITE_OK;
}

int size_of(sqlite3_file* file, sqlite3_int64* size) {
  if (g_disk.dead) return SQLITE_IOERR_FSTAT;
  *size = static_cast<sqlite3_int64>(content(file).present.size());
  return SQLITE_OK;
}

// One connection at a time: nothing to exclude.
int lock_file(sqlite3_file*, int) { return SQLITE_OK; }
int reserved(sqlite3_file*, int* answer) {
  *answer = 0;
  return SQLITE_OK;
}
int control(sqlite3_file*, int, void*) { return SQLITE_NOTFOUND; }
int sector_size(sqlite3_file*) { return 4096; }
int characteristics(sqlite3_file*) { return SQLITE_IOCAP_POWERSAFE_OVERWRITE; }  // as the default VFS says

int shm_map(sqlite3_file* file, int page, int size, int extend, void volatile** memory) {
  auto& shared = *reinterpret_cast<File*>(file)->shared;
  const auto wanted = static_cast<std::size_t>(page);
  while (extend != 0 && shared.size() <= wanted)
    shared.push_back(std::make_unique<std::vector<char>>(static_cast<std::size_t>(size), '\0'));
  *memory = wanted < shared.size() ? shared[wanted]->data() : nullptr;
  return SQLITE_OK;
}
int shm_lock(sqlite3_file*, int, int, int) { return SQLITE_OK; }
void shm_barrier(sqlite3_file*) {}
int shm_unmap(sqlite3_file* file, int) {
  reinterpret_cast<File*>(file)->shared->clear();
  return SQLITE_OK;
}

const sqlite3_io_methods kMethods{2,           close_file,  read_file,       write_file, truncate_file,
                                  sync_file,   size_of,     lock_file,       lock_file,  reserved,
                                  control,     sector_size, characteristics, shm_map,    shm_lock,
                                  shm_barrier, shm_unmap,   nullptr,         nullptr};

int open_file(sqlite3_vfs*, const char* name, sqlite3_file* file, int flags, int* out_flags) {
  file->pMethods = nullptr;
  if (g_disk.dead) return SQLITE_CANTOPEN;
  const std::string key = name != nullptr ? name : "temporary " + std::to_string(g_disk.files.size());
  auto found = g_disk.files.find(key);
  if (found == g_disk.files.end()) {
    if ((flags & SQLITE_OPEN_CREATE) == 0) return SQLITE_CANTOPEN;
    found = g_disk.files.emplace(key, std::make_shared<Content>()).first;
  }
  Held& held = g_held[file];
  held.content = found->second;
  auto* const ours = reinterpret_cast<File*>(file);
  ours->content = held.content.get();
  ours->shared = &held.shared;
  ours->base.pMethods = &kMethods;
  if (out_flags != nullptr) *out_flags = flags;
  return SQLITE_OK;
}

int remove_file(sqlite3_vfs*, const char* name, int) {
  if (g_disk.dead) return SQLITE_IOERR_DELETE;
  const auto found = g_disk.files.find(name);
  if (found == g_disk.files.end()) return SQLITE_IOERR_DELETE_NOENT;
  if (found->second->exists_durably) g_disk.removed[name] = found->second;
  g_disk.files.erase(found);
  return SQLITE_OK;
}

int access_file(sqlite3_vfs*, const char* name, int, int* answer) {
  if (g_disk.dead) return SQLITE_IOERR_ACCESS;
  *answer = g_disk.files.count(name) != 0 ? 1 : 0;
  return SQLITE_OK;
}

int full_path(sqlite3_vfs*, const char* name, int size, char* out) {
  sqlite3_snprintf(size, out, "%s", name);
  return SQLITE_OK;
}

class Coin {
 public:
  explicit Coin(std::uint64_t seed) : engine_(seed) {}
  bool flip() { return (engine_() & 1U) != 0; }
  std::size_t below(std::size_t n) { return n == 0 ? 0 : static_cast<std::size_t>(engine_() % n); }

 private:
  std::mt19937_64 engine_;
};

// The parts of a write that lie in different sectors of the disk.
std::vector<Change> sectors_of(const Change& write) {
  std::vector<Change> parts;
  for (std::size_t done = 0; done < write.bytes.size();) {
    const std::size_t room = kSector - (write.at + done) % kSector;
    parts.push_back({false, write.at + done, write.bytes.substr(done, room)});
    done += room;
  }
  return parts;
}

void settle(Content& file, Tear tear, Coin& coin) {
  const char hole = static_cast<char>(coin.below(256));
  const std::size_t whole = tear == Tear::prefix ? coin.below(file.unsynced.size() + 1) : 0;
  for (std::size_t i = 0; i < file.unsynced.size() && tear != Tear::drop; ++i) {
    const Change& change = file.unsynced[i];
    if (tear == Tear::prefix && i > whole) break;
    const bool torn = tear == Tear::subset || i == whole;
    if (change.truncate) {
      if (!torn || coin.flip()) apply(file.durable, change, hole);
      continue;
    }
    const std::vector<Change> parts = sectors_of(change);
    const std::size_t kept = tear == Tear::prefix && torn ? coin.below(parts.size() + 1) : parts.size();
    for (std::size_t part = 0; part < kept; ++part)
      if (tear != Tear::subset || coin.flip()) apply(file.durable, parts[part], hole);
  }
  file.present = file.durable;
  file.unsynced.clear();
}

sqlite3_vfs g_vfs;

}  // namespace

PowerCutDisk::PowerCutDisk() {
  // Time, random numbers and sleep are the default VFS's own.
  std::memcpy(&g_vfs, sqlite3_vfs_find(nullptr), sizeof g_vfs);
  g_vfs.zName = kName;
  g_vfs.pNext = nullptr;
  g_vfs.szOsFile = sizeof(File);
  g_vfs.xOpen = open_file;
  g_vfs.xDelete = remove_file;
  g_vfs.xAccess = access_file;
  g_vfs.xFullPathname = full_path;
  sqlite3_vfs_register(&g_vfs, 0);
  erase();
}

PowerCutDisk::~PowerCutDisk() {
  erase();
  sqlite3_vfs_unregister(&g_vfs);
}

std::string PowerCutDisk::vfs() const { return kName; }

void PowerCutDisk::cut_at_sync(std::uint64_t n) {
  g_disk.syncs = 0;
  g_disk.cut = n;
}

std::uint64_t PowerCutDisk::syncs() const { return g_disk.syncs; }

bool PowerCutDisk::dead() const { return g_disk.dead; }

void PowerCutDisk::power_on(Tear tear, std::uint64_t seed) {
  Coin coin(seed);
  for (const auto& [name, file] : g_disk.removed)
    if (tear == Tear::drop || coin.flip()) g_disk.files.emplace(name, file);  // the removal did not happen
  g_disk.removed.clear();
  std::erase_if(g_disk.files, [&](const auto& entry) {
    const Content& file = *entry.second;
    return !file.exists_durably && (tear == Tear::drop || coin.flip());
  });
  for (auto& [name, file] : g_disk.files) {
    settle(*file, tear, coin);
    file->exists_durably = true;
  }
  g_disk.dead = false;
  cut_at_sync(0);
}

void PowerCutDisk::erase() {
  g_disk = Disk{};
  g_held.clear();
}

}  // namespace pastern::faults
