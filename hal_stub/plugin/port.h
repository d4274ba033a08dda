// What the plug-in's table needs of a robot behind it: one that is stepped in process, or one across a
// socket.
#pragma once

#include <cstdint>
#include <memory>
#include <string>

#include "runtime/hal/pastern_hal.h"

namespace pastern::stub {

class Port {
 public:
  Port() = default;
  Port(const Port&) = delete;
  Port& operator=(const Port&) = delete;
  virtual ~Port() = default;
  virtual int read(pastern_hal_frame& frame) = 0;
  virtual int write(const pastern_hal_command& command) = 0;
  virtual bool save(std::string& state) = 0;
  virtual bool restore(const std::string& state) = 0;
  virtual bool carry_back(std::uint64_t draw) = 0;
  /// One line for the record; empty when the options say it all.
  [[nodiscard]] virtual const char* about() const { return ""; }
  /// One line about the last failure.
  [[nodiscard]] virtual const char* error_text() const = 0;
};

/// The robot in this process; each write advances time by a period. Null with a line in `error`.
[[nodiscard]] std::unique_ptr<Port> stepped_port(const pastern_hal_config& config,
                                                 const std::string& scenario, std::string& error);
/// Client of pastern-stub-robot at `socket`. Null with a line in `error`.
[[nodiscard]] std::unique_ptr<Port> bus_port(const pastern_hal_config& config, const std::string& socket,
                                             std::string& error);

}  // namespace pastern::stub
