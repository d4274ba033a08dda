// Reads cyclictest's histogram in nanoseconds back into samples.
#include "tests/bench/rig/cyclictest.h"

#include <fmt/format.h>

#include <cstdio>

namespace pastern::bench {

std::vector<double> run_cyclictest(int loops, int priority, std::string& error) {
  // -d0: no shift of the interval; -h: up to 1 ms in steps of 1 ns, larger ones are counted as the largest.
  const std::string command =
      fmt::format("cyclictest -q -m -t1 -d0 -i1000 -N -h1000000 -p{} -l{} 2>/dev/null", priority, loops);
  std::FILE* const out = popen(command.c_str(), "r");  // NOLINT(cert-env33-c): a fixed command of a bench
  if (out == nullptr) {
    error = "cannot start cyclictest";
    return {};
  }
  std::vector<double> latencies;
  char line[256];
  while (std::fgets(line, sizeof line, out) != nullptr) {
    long nanoseconds = 0;
    long count = 0;
    if (line[0] == '#' || std::sscanf(line, "%ld %ld", &nanoseconds, &count) != 2) continue;
    for (long i = 0; i < count; ++i) latencies.push_back(static_cast<double>(nanoseconds) * 1e-3);
  }
  const int status = pclose(out);
  if (status != 0 || latencies.empty()) {
    error = "cyclictest did not run: it needs rt-tests and the right to SCHED_FIFO";
    return {};
  }
  latencies.resize(static_cast<std::size_t>(loops), 1000.0);
  return latencies;
}

}  // namespace pastern::bench
