// One line a promise: name, value, bar, holds or short. Only promises.sh shows the judgement; nothing here is
// asserted.
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

/// A line beside a promise: measured, without a bar.
inline void printed(const std::string& name, const std::string& value) {
  std::printf("promise\t%s\t%s\t-\tprinted\n", name.c_str(), value.c_str());
  std::fflush(stdout);
}

}  // namespace pastern::bench
