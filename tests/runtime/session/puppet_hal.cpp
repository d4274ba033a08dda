// A HAL plug-in with a puppet behind it: each joint is a small inertia on its own, the trunk hangs upright
// and advances with the legs' motion. No physics of walking; enough for cycles, sessions and faults,
// deterministic. Options "key=value;...":
//   start=A,A,...   joint angles when put back on the mark, rad
//   fault=KIND      nan, lost, broken, mute (writes fail), estop, tilt, low_pack, hot; between the ticks
//   at=N for=N      counted since the robot was put back on its mark
//   only_draw=N     the fault comes only when draw % only_draw == 0
//   late=N          frames say that they were sampled N ms earlier (wall pace)
//   real=1          pretends to be real drives (another entry, see below)
#include <time.h>

#include <array>
#include <cmath>
#include <cstdint>
#include <cstdio>
#include <cstdlib>
#include <cstring>
#include <limits>
#include <sstream>
#include <string>

#include "runtime/hal/pastern_hal.h"

namespace {

constexpr double kInertia = 0.06;     // kg m2 a joint
constexpr double kFriction = 0.3;     // N m s/rad
constexpr double kStride_m = 0.0275;  // advance for a radian of joint motion
constexpr double kTiltRate = 3.0;     // rad/s, for the tilt fault
constexpr double kGravity = 9.80665;

// What save and restore carry; plain old data.
struct Body {
  std::uint64_t counter{0};
  std::int64_t time_ns{0};
  std::uint64_t noise{0x9e3779b97f4a7c15ULL};
  std::uint64_t draw{0};
  std::uint64_t since_mark{0};
  std::array<double, PASTERN_HAL_MAX_JOINTS> angle{};
  std::array<double, PASTERN_HAL_MAX_JOINTS> speed{};
  std::array<double, PASTERN_HAL_MAX_JOINTS> torque{};
  std::array<double, PASTERN_HAL_MAX_JOINTS> winding{};
  double x_m{0};
  double roll_rad{0};
  double pack_v{36};
};

struct Puppet {
  Body body;
  std::uint32_t joints{0};
  double period_s{0.001};
  std::array<double, PASTERN_HAL_MAX_JOINTS> start{};
  std::string fault;
  std::uint64_t at{0};
  std::uint64_t lasts{0};
  std::uint64_t only_draw{1};
  bool fresh{true};
  bool stepped{true};
  std::int64_t late_ns{0};
};

std::string option(const char* options, const std::string& key) {
  std::istringstream all(options);
  std::string entry;
  while (std::getline(all, entry, ';')) {
    if (entry.rfind(key + "=", 0) == 0) return entry.substr(key.size() + 1);
  }
  return "";
}

double noise(Body& body) {  // uniform in [-1, 1); xorshift64
  body.noise ^= body.noise << 13;
  body.noise ^= body.noise >> 7;
  body.noise ^= body.noise << 17;
  return static_cast<double>(body.noise >> 11) * (2.0 / 9007199254740992.0) - 1.0;
}

bool faulty(const Puppet& puppet, const char* kind) {
  return puppet.fault == kind && puppet.body.draw % puppet.only_draw == 0 &&
         puppet.body.since_mark >= puppet.at && puppet.body.since_mark < puppet.at + puppet.lasts;
}

void put_back(Puppet& puppet, std::uint64_t draw) {
  Body& body = puppet.body;
  body.draw = draw;
  body.noise = draw * 0x9e3779b97f4a7c15ULL + 0x1234567ULL;
  body.since_mark = 0;
  body.x_m = body.roll_rad = 0;
  for (std::uint32_t j = 0; j < puppet.joints; ++j) {
    body.angle[j] = puppet.start[j] + 0.01 * noise(body);
    body.speed[j] = body.torque[j] = 0;
  }
}

void* open_puppet(const pastern_hal_config* config, char* error, size_t capacity) {
  auto* puppet = new Puppet;
  puppet->joints = config->joint_count;
  puppet->period_s = config->period_s;
  std::istringstream angles(option(config->options, "start"));
  std::string angle;
  std::uint32_t given = 0;
  while (given < puppet->joints && std::getline(angles, angle, ','))
    puppet->start[given++] = std::atof(angle.c_str());
  if (given != puppet->joints) {
    std::snprintf(error, capacity, "start: found %u angles, expected %u", given, puppet->joints);
    delete puppet;
    return nullptr;
  }
  puppet->fault = option(config->options, "fault");
  puppet->at = std::strtoull(option(config->options, "at").c_str(), nullptr, 10);
  puppet->lasts = std::strtoull(option(config->options, "for").c_str(), nullptr, 10);
  const std::string only = option(config->options, "only_draw");
  if (!only.empty()) puppet->only_draw = std::strtoull(only.c_str(), nullptr, 10);
  puppet->stepped = config->stepped != 0;
  puppet->late_ns = std::strtoll(option(config->options, "late").c_str(), nullptr, 10) * 1'000'000;
  puppet->body.winding.fill(20);
  put_back(*puppet, config->seed);
  return puppet;
}

void close_puppet(void* handle) { delete static_cast<Puppet*>(handle); }

int read_puppet(void* handle, pastern_hal_frame* frame) {
  Puppet& puppet = *static_cast<Puppet*>(handle);
  Body& body = puppet.body;
  if (faulty(puppet, "broken")) return PASTERN_HAL_FAILED;
  if (faulty(puppet, "lost") || !puppet.fresh) return PASTERN_HAL_NO_FRAME;
  puppet.fresh = false;
  frame->joint_count = puppet.joints;
  frame->counter = ++body.counter;
  timespec now{};
  clock_gettime(CLOCK_MONOTONIC, &now);
  const std::int64_t wall_ns = static_cast<std::int64_t>(now.tv_sec) * 1'000'000'000 + now.tv_nsec;
  frame->time_ns = puppet.stepped ? body.time_ns : wall_ns - puppet.late_ns;
  for (std::uint32_t j = 0; j < puppet.joints; ++j) {
    frame->angle_rad[j] = body.angle[j] + 1e-4 * noise(body);
    frame->speed_rad_s[j] = body.speed[j];
    frame->torque_nm[j] = body.torque[j];
    frame->winding_c[j] = faulty(puppet, "hot") ? 100.0 : body.winding[j];
    frame->housing_c[j] = 20;
  }
  if (faulty(puppet, "nan")) frame->angle_rad[1] = std::numeric_limits<double>::quiet_NaN();
  frame->rate_rad_s[0] = faulty(puppet, "tilt") ? kTiltRate : 0.0;
  frame->rate_rad_s[1] = 1e-3 * noise(body);
  frame->rate_rad_s[2] = 0;
  frame->acceleration_m_s2[0] = 0;
  frame->acceleration_m_s2[1] = kGravity * std::sin(body.roll_rad);
  frame->acceleration_m_s2[2] = kGravity * std::cos(body.roll_rad) + 1e-3 * noise(body);
  frame->has_attitude = 0;
  frame->has_position = 1;
  frame->position_m[0] = body.x_m;
  frame->position_m[1] = 0.1 * body.x_m;
  frame->position_m[2] = 0.3;
  frame->pack_voltage_v = faulty(puppet, "low_pack") ? 25.0 : body.pack_v;
  frame->pack_current_a = 2;
  frame->emergency_stop = faulty(puppet, "estop") ? 1 : 0;
  return PASTERN_HAL_OK;
}

int write_puppet(void* handle, const pastern_hal_command* command) {
  Puppet& puppet = *static_cast<Puppet*>(handle);
  Body& body = puppet.body;
  const double dt = puppet.period_s;
  double motion = 0;
  for (std::uint32_t j = 0; j < puppet.joints; ++j) {
    const double torque = command->torque_on != 0 ? command->torque_nm[j] : 0.0;
    body.torque[j] = torque;
    body.speed[j] += dt * (torque - kFriction * body.speed[j]) / kInertia;
    if (command->torque_on == 0) body.speed[j] *= 0.9;
    body.angle[j] += dt * body.speed[j];
    body.winding[j] += dt * (1e-4 * torque * torque - 1e-3 * (body.winding[j] - 20.0));
    motion += std::fabs(body.speed[j]) * dt;
  }
  body.x_m += command->torque_on != 0 ? kStride_m * motion * (1.0 + 0.3 * noise(body)) : 0.0;
  if (faulty(puppet, "tilt")) body.roll_rad += kTiltRate * dt;
  body.pack_v -= 1e-7;
  ++body.since_mark;
  body.time_ns += static_cast<std::int64_t>(dt * 1e9);
  puppet.fresh = true;
  return faulty(puppet, "mute") ? PASTERN_HAL_FAILED : PASTERN_HAL_OK;
}

const char* error_text(void*) { return "the puppet's bus is broken, as asked"; }

int save_puppet(void* handle, void* buffer, size_t capacity, size_t* length) {
  *length = sizeof(Body);
  if (capacity < sizeof(Body)) return PASTERN_HAL_FAILED;
  std::memcpy(buffer, &static_cast<Puppet*>(handle)->body, sizeof(Body));
  return PASTERN_HAL_OK;
}

int restore_puppet(void* handle, const void* buffer, size_t length) {
  if (length != sizeof(Body)) return PASTERN_HAL_FAILED;
  std::memcpy(&static_cast<Puppet*>(handle)->body, buffer, sizeof(Body));
  static_cast<Puppet*>(handle)->fresh = true;
  return PASTERN_HAL_OK;
}

int carry_back_puppet(void* handle, uint64_t draw) {
  put_back(*static_cast<Puppet*>(handle), draw);
  return PASTERN_HAL_OK;
}

const pastern_hal kTable{
    PASTERN_HAL_VERSION, sizeof(pastern_hal), "puppet",     PUPPET_SIMULATED, open_puppet,
    close_puppet,        read_puppet,         write_puppet, error_text,       save_puppet,
    restore_puppet,      carry_back_puppet,   nullptr};

}  // namespace

extern "C" const pastern_hal* pastern_hal_entry(uint32_t version) {
  return version == PASTERN_HAL_VERSION ? &kTable : nullptr;
}
