// The one place that calls a plug-in's C table. Cycle thread only, after open().
#pragma once

#include <cstdint>
#include <memory>
#include <string>
#include <vector>

#include "safety/frames.h"

namespace pastern::hal {

struct DrivesConfig {
  std::string plugin;  ///< path of the shared object
  std::vector<std::string> joint_names;
  double period_s{0.001};
  double drive_timeout_s{0.020};
  std::string robot_file;
  std::string options;  ///< the plug-in's own, "key=value;key=value"
  std::uint64_t seed{0};
  bool stepped{false};
};

enum class ReadResult : std::uint8_t { fresh, none, failed };

class Drives {
 public:
  /// Null with one line in `error`: file missing, no entry, wrong version, a null function, open refused.
  [[nodiscard]] static std::unique_ptr<Drives> open(const DrivesConfig& config, std::string& error);
  ~Drives();
  Drives(const Drives&) = delete;
  Drives& operator=(const Drives&) = delete;

  /// `frame` is unchanged unless fresh. A frame with another joint count is `failed`.
  [[nodiscard]] ReadResult read(safety::SensorFrame& frame) noexcept;
  /// The only way to the drives; takes nothing but what the gate made.
  [[nodiscard]] bool write(const safety::DriveCommand& command) noexcept;
  /// One line about the last failure.
  [[nodiscard]] const char* error_text() noexcept;
  [[nodiscard]] bool simulated() const noexcept;
  /// What the plug-in says for the record; one line, at most 2 000 bytes, often empty.
  [[nodiscard]] const std::string& about() const noexcept;
  [[nodiscard]] const std::string& name() const noexcept;

  /// Simulated robots only; false when the plug-in has none or it fails. Between orders.
  [[nodiscard]] bool save(std::string& state);
  [[nodiscard]] bool restore(const std::string& state);
  [[nodiscard]] bool carry_back(std::uint64_t draw);

 private:
  Drives();
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::hal
