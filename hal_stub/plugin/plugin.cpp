// libpastern_hal_stub.so: the C table of runtime/hal/pastern_hal.h in front of a simulated robot.
// Options: scenario=PATH (nominal site when absent), socket=PATH (wall pace: of pastern-stub-robot),
// pace=stepped|wall (only to be checked against the caller's own word).
#include <cstdio>
#include <cstring>
#include <exception>
#include <map>
#include <memory>
#include <string>

#include "hal_stub/plugin/port.h"
#include "hal_stub/plugin/settings.h"
#include "runtime/hal/pastern_hal.h"

namespace pastern::stub {
namespace {

std::unique_ptr<Port> make_port(const pastern_hal_config& config, std::string& error) {
  if (config.struct_size != sizeof(pastern_hal_config)) {
    error = "config.struct_size: found " + std::to_string(config.struct_size) + ", expected " +
            std::to_string(sizeof(pastern_hal_config));
    return nullptr;
  }
  std::map<std::string, std::string> options;
  if (!parse_options(config.options, "scenario socket pace", options, error)) return nullptr;
  const char* pace = config.stepped != 0 ? "stepped" : "wall";
  if (options.count("pace") != 0 && options["pace"] != pace) {
    error = "options: found pace=" + options["pace"] + ", expected " + pace + " as the caller runs";
    return nullptr;
  }
  if (config.stepped != 0) return stepped_port(config, options["scenario"], error);
  if (options["socket"].empty()) {
    error = "options: found no socket=PATH, expected that of a running pastern-stub-robot (wall pace)";
    return nullptr;
  }
  return bus_port(config, options["socket"], error);
}

void* open(const pastern_hal_config* config, char* error, size_t capacity) {
  std::string line;
  try {
    if (config != nullptr) {
      if (auto port = make_port(*config, line)) return port.release();
    } else {
      line = "config: found null";
    }
  } catch (const std::exception& failure) {
    line = failure.what();
  }
  if (error != nullptr && capacity > 0) std::snprintf(error, capacity, "simulated robot: %s", line.c_str());
  return nullptr;
}

void close(void* handle) { delete static_cast<Port*>(handle); }

int read(void* handle, pastern_hal_frame* frame) {
  if (frame->struct_size != sizeof(pastern_hal_frame)) return PASTERN_HAL_FAILED;
  return static_cast<Port*>(handle)->read(*frame);
}

int write(void* handle, const pastern_hal_command* command) {
  if (command->struct_size != sizeof(pastern_hal_command)) return PASTERN_HAL_FAILED;
  return static_cast<Port*>(handle)->write(*command);
}

const char* error_text(void* handle) { return static_cast<Port*>(handle)->error_text(); }

int save(void* handle, void* buffer, size_t capacity, size_t* length) {
  std::string state;
  if (!static_cast<Port*>(handle)->save(state)) return PASTERN_HAL_FAILED;
  *length = state.size();
  if (state.size() > capacity) return PASTERN_HAL_FAILED;
  std::memcpy(buffer, state.data(), state.size());
  return PASTERN_HAL_OK;
}

int restore(void* handle, const void* buffer, size_t length) {
  const std::string state(static_cast<const char*>(buffer), length);
  return static_cast<Port*>(handle)->restore(state) ? PASTERN_HAL_OK : PASTERN_HAL_FAILED;
}

int carry_back(void* handle, uint64_t draw) {
  return static_cast<Port*>(handle)->carry_back(draw) ? PASTERN_HAL_OK : PASTERN_HAL_FAILED;
}

const char* about(void* handle) { return static_cast<Port*>(handle)->about(); }

constexpr pastern_hal kTable = {PASTERN_HAL_VERSION,
                                sizeof(pastern_hal),
                                "simulated robot",
                                1,
                                open,
                                close,
                                read,
                                write,
                                error_text,
                                save,
                                restore,
                                carry_back,
                                about};

}  // namespace
}  // namespace pastern::stub

extern "C" __attribute__((visibility("default"))) const pastern_hal* pastern_hal_entry(uint32_t version) {
  return version == PASTERN_HAL_VERSION ? &pastern::stub::kTable : nullptr;
}
