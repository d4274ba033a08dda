// An SQLite VFS in memory that keeps what was not synced apart. At a chosen sync the power goes: nothing
// works any more, and of the unsynced writes only some sectors, chosen by a seed, are on the disk afterwards.
//
// Crash model: a sync makes a file's bytes, size and existence durable. Before it, any 512-byte sector of any
// write may be on the disk or not, in any order; a size change may have happened or not; a hole that appears
// holds what the disk held before (garbage). A removal may have happened or not until the next sync of any
// file. Sectors are whole: old or new.
#pragma once

#include <cstdint>
#include <string>

namespace pastern::faults {

/// What becomes of unsynced writes.
enum class Tear : std::uint8_t {
  drop = 0,    ///< all are lost
  prefix = 1,  ///< those up to a random one are kept, that one up to a random sector
  subset = 2,  ///< every sector of every write is kept or lost by a coin
};

class PowerCutDisk {
 public:
  PowerCutDisk();
  ~PowerCutDisk();
  PowerCutDisk(const PowerCutDisk&) = delete;
  PowerCutDisk& operator=(const PowerCutDisk&) = delete;

  [[nodiscard]] std::string vfs() const;  ///< its name, for Journal::open
  /// The power goes at the n-th sync from now, before it does anything (1 = the next); 0: never.
  void cut_at_sync(std::uint64_t n);
  [[nodiscard]] std::uint64_t syncs() const;  ///< since the last cut_at_sync()
  [[nodiscard]] bool dead() const;
  /// Every file must be closed. Settles what the cut left on the disk, and works again.
  void power_on(Tear tear, std::uint64_t seed);
  /// An empty disk.
  void erase();
};

}  // namespace pastern::faults
