// The command line of pastern-onboard.
#pragma once

#include <cstdint>
#include <optional>
#include <string>

#include "runtime/session/cycle.h"

namespace pastern::onboard {

struct Options {
  std::string robot;
  std::string policy;
  std::string hal;
  std::string hal_options;
  std::string journal;
  std::string keys;
  std::string host{"127.0.0.1"};
  session::Pace pace{session::Pace::wall};
  int command_port{7741};
  int telemetry_port{7742};
  int fetch_port{7743};
  int baton_lapse_ms{500};
  int cpu{-1};
  int priority{80};
  std::uint64_t seed{0};
  bool help{false};
};

[[nodiscard]] const char* help_text();

/// Nothing with one line in `error` (argument, found, expected) when the command line is wrong.
[[nodiscard]] std::optional<Options> parse_options(int argc, const char* const* argv, std::string& error);

}  // namespace pastern::onboard
