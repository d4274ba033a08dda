// Forwards everything to the default VFS but writes beyond the budget.
#include "tests/faults/full_disk_vfs.h"

#include <sqlite3.h>

#include <cstring>

namespace pastern::faults {
namespace {

constexpr const char* kName = "pastern_full_disk";

std::int64_t g_left = -1;
std::int64_t g_written = 0;

struct File {
  sqlite3_file base;
  sqlite3_file* real;  // lies behind this object in the memory that SQLite hands us
};

sqlite3_file* real(sqlite3_file* file) { return reinterpret_cast<File*>(file)->real; }
sqlite3_vfs* beneath(sqlite3_vfs* vfs) { return static_cast<sqlite3_vfs*>(vfs->pAppData); }

int close_file(sqlite3_file* f) { return real(f)->pMethods->xClose(real(f)); }
int read_file(sqlite3_file* f, void* to, int size, sqlite3_int64 at) {
  return real(f)->pMethods->xRead(real(f), to, size, at);
}
int write_file(sqlite3_file* f, const void* from, int size, sqlite3_int64 at) {
  g_written += size;
  if (g_left < 0) return real(f)->pMethods->xWrite(real(f), from, size, at);
  if (size <= g_left) {
    g_left -= size;
    return real(f)->pMethods->xWrite(real(f), from, size, at);
  }
  const int fits = static_cast<int>(g_left);
  g_left = 0;
  if (fits > 0) (void)real(f)->pMethods->xWrite(real(f), from, fits, at);
  return SQLITE_FULL;
}
int truncate_file(sqlite3_file* f, sqlite3_int64 size) { return real(f)->pMethods->xTruncate(real(f), size); }
int sync_file(sqlite3_file* f, int flags) { return real(f)->pMethods->xSync(real(f), flags); }
int size_of(sqlite3_file* f, sqlite3_int64* size) { return real(f)->pMethods->xFileSize(real(f), size); }
int lock_file(sqlite3_file* f, int level) { return real(f)->pMethods->xLock(real(f), level); }
int unlock_file(sqlite3_file* f, int level) { return real(f)->pMethods->xUnlock(real(f), level); }
int reserved(sqlite3_file* f, int* answer) { return real(f)->pMethods->xCheckReservedLock(real(f), answer); }
int control(sqlite3_file* f, int op, void* argument) {
  return real(f)->pMethods->xFileControl(real(f), op, argument);
}
int sector_size(sqlite3_file* f) { return real(f)->pMethods->xSectorSize(real(f)); }
int characteristics(sqlite3_file* f) { return real(f)->pMethods->xDeviceCharacteristics(real(f)); }
int shm_map(sqlite3_file* f, int page, int size, int extend, void volatile** memory) {
  return real(f)->pMethods->xShmMap(real(f), page, size, extend, memory);
}
int shm_lock(sqlite3_file* f, int first, int count, int flags) {
  return real(f)->pMethods->xShmLock(real(f), first, count, flags);
}
void shm_barrier(sqlite3_file* f) { real(f)->pMethods->xShmBarrier(real(f)); }
int shm_unmap(sqlite3_file* f, int remove) { return real(f)->pMethods->xShmUnmap(real(f), remove); }

const sqlite3_io_methods kMethods{2,           close_file,  read_file,       write_file,  truncate_file,
                                  sync_file,   size_of,     lock_file,       unlock_file, reserved,
                                  control,     sector_size, characteristics, shm_map,     shm_lock,
                                  shm_barrier, shm_unmap,   nullptr,         nullptr};

int open_file(sqlite3_vfs* vfs, const char* name, sqlite3_file* file, int flags, int* out_flags) {
  auto* const ours = reinterpret_cast<File*>(file);
  ours->base.pMethods = nullptr;
  ours->real = reinterpret_cast<sqlite3_file*>(ours + 1);
  const int code = beneath(vfs)->xOpen(beneath(vfs), name, ours->real, flags, out_flags);
  if (code == SQLITE_OK) ours->base.pMethods = &kMethods;
  return code;
}

sqlite3_vfs g_vfs;

}  // namespace

FullDisk::FullDisk() {
  sqlite3_vfs* const standard = sqlite3_vfs_find(nullptr);
  // What is not replaced is the default VFS's own: its functions look only at their arguments.
  std::memcpy(&g_vfs, standard, sizeof g_vfs);
  g_vfs.zName = kName;
  g_vfs.pNext = nullptr;
  g_vfs.pAppData = standard;
  g_vfs.szOsFile = static_cast<int>(sizeof(File)) + standard->szOsFile;
  g_vfs.xOpen = open_file;
  g_left = -1;
  sqlite3_vfs_register(&g_vfs, 0);
}

FullDisk::~FullDisk() { sqlite3_vfs_unregister(&g_vfs); }

std::string FullDisk::vfs() const { return kName; }

void FullDisk::leave(std::int64_t bytes) {
  g_left = bytes;
  g_written = 0;
}

std::int64_t FullDisk::written() const { return g_written; }

}  // namespace pastern::faults
