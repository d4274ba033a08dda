// The real pastern-onboard as a child process, round the looped plug-in, for benches of the whole program.
#pragma once

#include <sys/types.h>

#include <memory>
#include <string>

#include "proto/files/robot_file.h"
#include "tests/bench/rig/looped_hal.h"

namespace pastern::bench {

class OnboardProcess {
 public:
  /// Writes robot and policy into `folder`, starts the program there at wall pace and waits until it says
  /// that it is ready. With a key folder it listens with CURVE. Null with one line in `error`.
  [[nodiscard]] static std::unique_ptr<OnboardProcess> start(const v1::Robot& robot,
                                                             const std::string& folder,
                                                             const std::string& more_hal_options,
                                                             std::string& error,
                                                             const std::string& key_folder = {});
  ~OnboardProcess();  ///< SIGTERM, waits, then SIGKILL
  OnboardProcess(const OnboardProcess&) = delete;
  OnboardProcess& operator=(const OnboardProcess&) = delete;

  /// False once the program has ended by itself.
  [[nodiscard]] bool alive();
  [[nodiscard]] int command_port() const { return command_port_; }
  [[nodiscard]] int telemetry_port() const { return telemetry_port_; }
  [[nodiscard]] int fetch_port() const { return fetch_port_; }
  [[nodiscard]] const files::RobotFile& robot() const { return robot_; }
  /// The commands that reach the drives, as they are written.
  [[nodiscard]] const looped_ring& ring() const { return *ring_; }
  /// The second line that the program prints: SCHED_FIFO or why not.
  [[nodiscard]] const std::string& scheduling() const { return scheduling_; }

 private:
  explicit OnboardProcess(files::RobotFile robot) : robot_(std::move(robot)) {}
  [[nodiscard]] bool launch(const std::string& folder, const std::string& hal_options,
                            const std::string& key_folder, std::string& error);
  void look_for_ready(const std::string& out_path);

  files::RobotFile robot_;
  pid_t child_{-1};
  int command_port_{0};
  int telemetry_port_{0};
  int fetch_port_{0};
  const looped_ring* ring_{nullptr};
  std::string scheduling_;
};

}  // namespace pastern::bench
