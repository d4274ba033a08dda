// One line a promise: name, value, bar, holds or short or not measured. Only promises.sh shows the judgement;
// nothing here is asserted.
#pragma once

#include <cstdio>
#include <string>

namespace pastern::bench {

/// `value` and `bar` with their units, for people; `holds` is the judgement. Returns `holds` so that a bench
/// can count.
inline bool promise(const std::string& name, const std::string& value, const std::string& bar, bool holds) {
  std::printf("promise\t%s\t%s\t%s\t%s\n", name.c_str(), value.c_str(), bar.c_str(),
              holds ? "holds" : "short");
  std::fflush(stdout);
  return holds;
}

/// The bench's own means failed (a tracer that was refused, a host that stalled): nothing is known about the
/// promise, for better or worse. `why` in words.
inline void not_measured(const std::string& name, const std::string& why, const std::string& bar) {
  std::printf("promise\t%s\t%s\t%s\tnot measured\n", name.c_str(), why.c_str(), bar.c_str());
  std::fflush(stdout);
}

/// A line beside a promise: measured, without a bar.
inline void printed(const std::string& name, const std::string& value) {
  std::printf("promise\t%s\t%s\t-\tprinted\n", name.c_str(), value.c_str());
  std::fflush(stdout);
}

}  // namespace pastern::bench
