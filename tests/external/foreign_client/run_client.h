// Runs the client in Python to its end.
#pragma once

#include <string>

#include "runtime/link/server.h"

namespace pastern::external {

struct Ended {
  int status{-1};
  std::string output;  ///< stdout and stderr
};

[[nodiscard]] Ended run_client(const link::Ports& ports, const std::string& more);

}  // namespace pastern::external
