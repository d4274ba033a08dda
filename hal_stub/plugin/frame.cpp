// Copies, field by field.
#include "hal_stub/plugin/frame.h"

#include <algorithm>

namespace pastern::stub {

void fill_frame(const safety::SensorFrame& from, pastern_hal_frame& to) noexcept {
  const std::uint32_t size = to.struct_size;
  to = {};
  to.struct_size = size;
  to.joint_count = static_cast<std::uint32_t>(from.joint_count);
  to.counter = from.counter;
  to.time_ns = from.time.value;
  for (int j = 0; j < from.joint_count; ++j) {
    to.angle_rad[j] = from.angle[j];
    to.speed_rad_s[j] = from.speed[j];
    to.torque_nm[j] = from.torque[j];
    to.winding_c[j] = from.winding[j];
    to.housing_c[j] = from.housing[j];
  }
  const double rate[3] = {from.rate.x, from.rate.y, from.rate.z};
  const double acceleration[3] = {from.acceleration.x, from.acceleration.y, from.acceleration.z};
  const double position[3] = {from.position.x, from.position.y, from.position.z};
  std::copy(rate, rate + 3, to.rate_rad_s);
  std::copy(acceleration, acceleration + 3, to.acceleration_m_s2);
  std::copy(position, position + 3, to.position_m);
  to.attitude_wxyz[0] = 1;
  to.pack_voltage_v = from.pack_voltage_v;
  to.pack_current_a = from.pack_current_a;
  to.has_position = from.has_position ? 1 : 0;
  to.emergency_stop = from.emergency_stop ? 1 : 0;
}

safety::Torques<> torques_of(const pastern_hal_command& command) noexcept {
  safety::Torques<> torque;
  const std::uint32_t count = std::min<std::uint32_t>(command.joint_count, PASTERN_HAL_MAX_JOINTS);
  for (std::uint32_t j = 0; j < count; ++j) torque[static_cast<int>(j)] = command.torque_nm[j];
  return torque;
}

}  // namespace pastern::stub
