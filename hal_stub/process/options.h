// Command line of pastern-stub-robot.
#pragma once

#include <cstdint>
#include <string>

namespace pastern::stub {

struct ProcessOptions {
  std::string robot;
  std::string scenario;
  std::string socket;
  std::string trace;  ///< empty: none
  std::uint64_t seed{0};
  std::uint64_t every{10};  ///< a line of the trace each so many ticks
  bool help{false};
};

/// False with one line in `error`.
[[nodiscard]] bool parse_command_line(int count, char** words, ProcessOptions& options, std::string& error);
[[nodiscard]] const char* usage();

}  // namespace pastern::stub
