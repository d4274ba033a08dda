// Runs cyclictest (Debian package rt-tests): the machine's own wake-up latency, beside which ours is judged.
#pragma once

#include <string>
#include <vector>

namespace pastern::bench {

/// `loops` wake-ups a millisecond apart of one thread at SCHED_FIFO `priority`, memory locked: latencies in
/// us, sorted. Empty with a line in `error` when it cannot run.
[[nodiscard]] std::vector<double> run_cyclictest(int loops, int priority, std::string& error);

}  // namespace pastern::bench
