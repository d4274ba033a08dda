// A HAL plug-in that lies: the puppet behind it, its frames spoilt by a seeded draw for a while (not finite,
// huge, old, repeated, of other joint counts, frozen, late), reads and writes that fail. Options as the
// puppet's, and puppet=PATH.
#include "tests/runtime/session/hostile_hal.h"

#include <dlfcn.h>

#include <cmath>
#include <cstdio>
#include <string>

#include "tests/safety/hard_numbers.h"

namespace {

using pastern::safety::test::Dice;

struct Hostile {
  const pastern_hal* table{nullptr};
  void* puppet{nullptr};
  Dice dice{1};
  int kind{-1};
  int left{0};
  std::uint32_t joints{0};
  pastern_hal_frame last{};
};

HostileTick g_tick{};

void* open_hostile(const pastern_hal_config* config, char* error, size_t capacity) {
  const std::string options = config->options;
  const std::size_t at = options.find("puppet=") + 7;
  void* library = dlopen(options.substr(at, options.find(';', at) - at).c_str(), RTLD_NOW | RTLD_LOCAL);
  if (library == nullptr) {
    std::snprintf(error, capacity, "no puppet");
    return nullptr;
  }
  auto* hostile = new Hostile;
  const auto entry = reinterpret_cast<pastern_hal_entry_fn>(dlsym(library, "pastern_hal_entry"));
  hostile->table = entry(PASTERN_HAL_VERSION);
  hostile->puppet = hostile->table->open(config, error, capacity);
  hostile->dice = Dice(config->seed);
  hostile->joints = config->joint_count;
  g_tick = {};
  return hostile;
}

void close_hostile(void* handle) {
  auto* hostile = static_cast<Hostile*>(handle);
  hostile->table->close(hostile->puppet);
  delete hostile;
}

void spoil(Hostile& h, pastern_hal_frame& frame) {
  const auto j = static_cast<std::size_t>(h.dice.below(static_cast<int>(h.joints)));
  switch (h.kind) {
    case 0:
      frame.angle_rad[j] = h.dice.hard(frame.angle_rad[j]);
      break;
    case 1:
      frame.speed_rad_s[j] = h.dice.hard(20.0);
      break;
    case 2:
      frame.torque_nm[j] = h.dice.hard(34.0);
      break;
    case 3:
      frame.rate_rad_s[2] = h.dice.hard(6.0);
      break;
    case 4:
      frame.acceleration_m_s2[1] = h.dice.hard(9.8);
      break;
    case 5:
      frame.winding_c[j] = h.dice.hard(100.0);
      break;
    case 6:
      frame.pack_voltage_v = h.dice.hard(30.0);
      break;
    case 7:
      frame.counter = h.dice.bits();
      break;
    case 8:
      frame.time_ns = static_cast<int64_t>(h.dice.bits());
      break;
    case 9:
      frame.joint_count = static_cast<uint32_t>(h.dice.bits() >> h.dice.below(64));
      break;
    case 10:
      frame = h.last;
      break;  // a frame from the past
    case 11:
      frame.emergency_stop = static_cast<uint8_t>(1 + h.dice.below(255));
      break;
    case 12:
      frame.has_attitude = 1;
      frame.attitude_wxyz[0] = h.dice.hard(1.0);
      break;
    case 13:
      frame.position_m[2] = h.dice.hard(0.3);
      break;
    default:
      break;
  }
}

bool no_choice(const Hostile& h, const pastern_hal_frame& frame) {
  bool off = frame.emergency_stop != 0 || frame.joint_count != h.joints;
  for (std::size_t j = 0; j < h.joints; ++j) off = off || !std::isfinite(frame.speed_rad_s[j]);
  return off;
}

int read_hostile(void* handle, pastern_hal_frame* frame) {
  Hostile& h = *static_cast<Hostile*>(handle);
  if (h.left-- <= 0) {
    h.kind = h.dice.one_in(25) ? h.dice.below(18) : -1;
    h.left = h.kind < 0 ? h.dice.below(60) : h.dice.below(6);
  }
  int result = h.table->read(h.puppet, frame);
  if (h.dice.one_in(50)) h.last = *frame;
  spoil(h, *frame);
  if (h.kind == 14) result = PASTERN_HAL_NO_FRAME;
  if (h.kind == 15) result = h.dice.one_in(2) ? PASTERN_HAL_FAILED : static_cast<int>(h.dice.bits());
  if (h.kind == 16) frame->struct_size = 3;
  const bool fresh = result == PASTERN_HAL_OK;
  const bool failed = !fresh && result != PASTERN_HAL_NO_FRAME;
  g_tick.forbids_torque = failed || g_tick.write_failed || (fresh && no_choice(h, *frame));
  return result;
}

int write_hostile(void* handle, const pastern_hal_command* command) {
  Hostile& h = *static_cast<Hostile*>(handle);
  g_tick.command = *command;
  const int result = h.table->write(h.puppet, command);
  g_tick.write_failed = h.kind == 17;
  return g_tick.write_failed ? PASTERN_HAL_FAILED : result;
}

const char* error_text(void*) { return nullptr; }

int carry_back(void* handle, uint64_t draw) {
  Hostile& h = *static_cast<Hostile*>(handle);
  return h.table->carry_back(h.puppet, draw);
}

const pastern_hal kTable{
    PASTERN_HAL_VERSION, sizeof(pastern_hal), "hostile", 1,       open_hostile, close_hostile, read_hostile,
    write_hostile,       error_text,          nullptr,   nullptr, carry_back,   nullptr};

}  // namespace

extern "C" const pastern_hal* pastern_hal_entry(uint32_t version) {
  return version == PASTERN_HAL_VERSION ? &kTable : nullptr;
}
extern "C" const HostileTick* hostile_last() { return &g_tick; }
