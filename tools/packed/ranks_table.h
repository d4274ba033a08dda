// What libpastern_ranks.so offers: the few things that packed walks ask of MPI. Loaded by ranks.cpp only when
// the process was started by mpirun, so that nothing here needs MPI otherwise.
#pragma once

#include <cstddef>

extern "C" {

struct pastern_ranks_table {
  int version;  ///< kPasternRanksVersion
  /// Joins the others: 0, or not with a line in `error`.
  int (*join)(int* rank, int* count, char* error, std::size_t error_size);
  /// Each rank's `bytes[rank]` bytes at `mine` to all ranks, in order of rank. 0 when it went well.
  int (*gather)(const void* mine, void* all, const int* bytes, const int* places);
  /// After the last gather. All ranks do it.
  void (*leave)(void);
  /// Ends all ranks at once.
  void (*abandon)(int code);
};

/// The one name that the library exports.
const pastern_ranks_table* pastern_ranks_entry(void);
}

inline constexpr int kPasternRanksVersion = 1;
