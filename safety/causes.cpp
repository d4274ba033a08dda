// Names and units of causes, reactions, phases and holds.
#include <array>

#include "safety/trip.h"

namespace pastern::safety {
namespace {

struct Text {
  const char* name;
  const char* unit;
};

/// In the order of Cause.
constexpr std::array<Text, kCauseCount> kCauses{{
    {"none", ""},
    {"roll", "rad"},
    {"pitch", "rad"},
    {"body_rate", "rad/s"},
    {"base_low", "m"},
    {"measured_torque", "N m"},
    {"joint_position", "rad"},
    {"joint_speed", "rad/s"},
    {"winding_temperature", "deg C"},
    {"thermal_model", "of limit"},
    {"pack_voltage_low", "V"},
    {"pack_current_high", "A"},
    {"frame_not_finite", ""},
    {"frame_out_of_range", ""},
    {"frame_stale", "s"},
    {"frame_frozen", "ticks"},
    {"frame_jump", "rad"},
    {"tick_overrun", "s"},
    {"baton_lost", ""},
    {"operator_stop", ""},
    {"operator_halt", ""},
    {"emergency_stop", ""},
    {"command_not_finite", ""},
    {"bus_error", ""},
    {"internal_stop", ""},
}};
static_assert(kCauses.back().name != nullptr, "every cause has a name");

template <std::size_t N>
const char* entry(const std::array<const char*, N>& names, unsigned index) noexcept {
  return index < N ? names[index] : "unknown";
}

}  // namespace

const char* name(Cause cause) noexcept {
  const auto index = static_cast<std::size_t>(cause);
  return index < kCauses.size() ? kCauses[index].name : "unknown";
}

const char* unit(Cause cause) noexcept {
  const auto index = static_cast<std::size_t>(cause);
  return index < kCauses.size() ? kCauses[index].unit : "";
}

const char* name(Reaction reaction) noexcept {
  static constexpr std::array<const char*, 2> kNames{"ramp_down", "torque_off"};
  return entry(kNames, static_cast<unsigned>(reaction));
}

const char* name(Phase phase) noexcept {
  static constexpr std::array<const char*, 4> kNames{"armed", "damping", "lowering", "off"};
  return entry(kNames, static_cast<unsigned>(phase));
}

const char* name(Hold hold) noexcept {
  static constexpr std::array<const char*, 5> kNames{"none", "winding_warm", "thermal_model", "pack_floor",
                                                     "tripped"};
  return entry(kNames, static_cast<unsigned>(hold));
}

}  // namespace pastern::safety
