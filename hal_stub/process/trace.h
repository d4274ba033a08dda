// What is really so, as lines of text: for tests and for people who want to see what happened to the robot.
#pragma once

#include <cstdint>
#include <cstdio>
#include <string>

#include "hal_stub/robot/simulated_robot.h"

namespace pastern::stub {

class Trace {
 public:
  Trace() = default;
  ~Trace();
  Trace(const Trace&) = delete;
  Trace& operator=(const Trace&) = delete;

  /// Appends to `path`; writes the line of column names when the file is empty.
  [[nodiscard]] bool open(const std::string& path, std::string& error);
  /// One line, on disk at once as far as the kernel is concerned. Nothing when not open.
  void add(const SimulatedRobot& robot, std::int64_t now_ns, std::uint64_t commands, std::uint64_t skipped);

 private:
  std::FILE* file_{nullptr};
};

}  // namespace pastern::stub
