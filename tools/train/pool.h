// Spreads independent jobs over threads. Which thread does which job is left open; results must not depend on
// it.
#pragma once

#include <cstddef>
#include <functional>

namespace pastern::tools {

/// Threads to use when nobody says: as many as the machine runs at once, at least 1.
[[nodiscard]] unsigned all_threads();

/// Runs job(worker, i) for i in 0..count-1, each once, on `threads` threads (worker 0..threads-1; worker 0 is
/// the caller). Returns when all are done. The first exception of a job is thrown again here, after the
/// others have stopped.
void spread(unsigned threads, std::size_t count,
            const std::function<void(unsigned worker, std::size_t i)>& job);

}  // namespace pastern::tools
