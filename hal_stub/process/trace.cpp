// Lines of truth.
#include "hal_stub/process/trace.h"

#include <cerrno>
#include <cinttypes>
#include <cmath>
#include <cstring>

namespace pastern::stub {

Trace::~Trace() {
  if (file_ != nullptr) std::fclose(file_);
}

bool Trace::open(const std::string& path, std::string& error) {
  file_ = std::fopen(path.c_str(), "ae");
  if (file_ == nullptr) {
    error = "trace " + path + ": " + std::strerror(errno);
    return false;
  }
  std::setvbuf(file_, nullptr, _IOLBF, 1024);
  if (std::ftell(file_) == 0) {
    std::fputs(
        "time_ns time_s x_m y_m height_m roll_rad pitch_rad yaw_rad torque torque_max_nm fallen commands "
        "skipped\n",
        file_);
  }
  return true;
}

void Trace::add(const SimulatedRobot& robot, std::int64_t now_ns, std::uint64_t commands,
                std::uint64_t skipped) {
  if (file_ == nullptr) return;
  const Truth t = robot.truth();
  const char* torque = robot.torque_mode() == TorqueMode::on        ? "on"
                       : robot.torque_mode() == TorqueMode::damping ? "damping"
                                                                    : "off";
  double most = 0;
  for (int j = 0; j < robot.model().joint_count(); ++j) {
    most = std::fmax(most, std::fabs(robot.state().drives.torque[static_cast<std::size_t>(j)]));
  }
  std::fprintf(file_, "%" PRId64 " %.3f %.4f %.4f %.4f %.4f %.4f %.4f %s %.3f %d %" PRIu64 " %" PRIu64 "\n",
               now_ns, robot.time_s(), t.position_m[0], t.position_m[1], t.height_m, t.roll_rad, t.pitch_rad,
               t.yaw_rad, torque, most, t.fallen ? 1 : 0, commands, skipped);
}

}  // namespace pastern::stub
