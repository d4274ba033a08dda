// The only file that sees MPI (MPI-3.1, C bindings).
#define OMPI_SKIP_MPICXX 1
#include <mpi.h>

#include <cstdio>

#include "tools/packed/ranks_table.h"

namespace {

int join(int* rank, int* count, char* error, std::size_t error_size) {
  int provided = 0;
  // Only the thread that joined speaks; walks run in threads that do not.
  if (MPI_Init_thread(nullptr, nullptr, MPI_THREAD_FUNNELED, &provided) != MPI_SUCCESS ||
      provided < MPI_THREAD_FUNNELED) {
    std::snprintf(error, error_size, "MPI did not start with threads beside it");
    return 1;
  }
  if (MPI_Comm_rank(MPI_COMM_WORLD, rank) != MPI_SUCCESS ||
      MPI_Comm_size(MPI_COMM_WORLD, count) != MPI_SUCCESS) {
    std::snprintf(error, error_size, "MPI does not say which rank this is");
    return 1;
  }
  return 0;
}

int gather(const void* mine, void* all, const int* bytes, const int* places) {
  int rank = 0;
  if (MPI_Comm_rank(MPI_COMM_WORLD, &rank) != MPI_SUCCESS) return 1;
  return MPI_Allgatherv(mine, bytes[rank], MPI_BYTE, all, bytes, places, MPI_BYTE, MPI_COMM_WORLD);
}

void leave() { static_cast<void>(MPI_Finalize()); }

void abandon(int code) { static_cast<void>(MPI_Abort(MPI_COMM_WORLD, code)); }

constexpr pastern_ranks_table kTable = {kPasternRanksVersion, join, gather, leave, abandon};

}  // namespace

extern "C" __attribute__((visibility("default"))) const pastern_ranks_table* pastern_ranks_entry() {
  return &kTable;
}
