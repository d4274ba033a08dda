// Runs the client in Python to its end.
#include "tests/external/foreign_client/run_client.h"

#include <sys/wait.h>

#include <array>
#include <cstdio>

namespace pastern::external {

// Debian's own Python: another one on the path may lack the packages.
Ended run_client(const link::Ports& ports, const std::string& more) {
  const std::string command = std::string("/usr/bin/python3 -B ") + FOREIGN_CLIENT + " --messages " +
                              FOREIGN_MESSAGES + " --command-port " + std::to_string(ports.command) +
                              " --telemetry-port " + std::to_string(ports.telemetry) + " --fetch-port " +
                              std::to_string(ports.fetch) + " " + more + " 2>&1";
  Ended ended;
  std::FILE* pipe = ::popen(command.c_str(), "r");
  if (pipe == nullptr) return ended;
  std::array<char, 512> part{};
  while (std::fgets(part.data(), part.size(), pipe) != nullptr) ended.output += part.data();
  const int status = ::pclose(pipe);
  ended.status = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
  return ended;
}

}  // namespace pastern::external
