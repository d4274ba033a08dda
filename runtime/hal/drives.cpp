// The one file that calls a plug-in's C table. read() and write() run in the cycle thread: copies only, no
// heap.
#include "runtime/hal/drives.h"

#include <dlfcn.h>

#include <array>
#include <cstddef>
#include <cstdio>
#include <type_traits>
#include <utility>

#include "runtime/hal/pastern_hal.h"

namespace pastern::hal {

static_assert(PASTERN_HAL_MAX_JOINTS == safety::kMaxJoints);
static_assert(std::is_standard_layout_v<pastern_hal_frame> && std::is_standard_layout_v<pastern_hal_command>);

struct Drives::Impl {
  void* library{nullptr};
  const pastern_hal* table{nullptr};
  void* handle{nullptr};
  std::string name;
  std::string about;
  std::int32_t joint_count{0};
  pastern_hal_frame frame{};
  pastern_hal_command command{};
  std::array<char, 192> own_text{};  // a failure that this file found; empty: ask the plug-in

  Impl() = default;
  Impl(const Impl&) = delete;
  Impl& operator=(const Impl&) = delete;
  ~Impl() {
    if (handle != nullptr) {
      table->close(handle);
    }
    if (library != nullptr) {
      dlclose(library);
    }
  }
};

namespace {

constexpr std::size_t kMostStateBytes = std::size_t{16} << 20;

bool is_control(char letter) noexcept {
  const auto byte = static_cast<unsigned char>(letter);
  return byte < 0x20 || byte == 0x7f;
}

/// A plug-in's words end up in logs and journals: one line of printable characters, whatever it wrote.
constexpr std::size_t kLongestAbout = 2000;

std::string one_line(const char* text, std::size_t capacity) {
  std::string line;
  for (std::size_t i = 0; i < capacity && text[i] != '\0'; ++i) {
    line += is_control(text[i]) ? ' ' : text[i];
  }
  return line;
}

std::string refusal(const std::string& plugin, const std::string& what) {
  return "plug-in " + plugin + ": " + what;
}

/// First function that the contract demands and the table lacks, or null.
const char* missing_function(const pastern_hal& table) {
  if (table.open == nullptr) {
    return "open";
  }
  if (table.close == nullptr) {
    return "close";
  }
  if (table.read == nullptr) {
    return "read";
  }
  if (table.write == nullptr) {
    return "write";
  }
  return table.error_text == nullptr ? "error_text" : nullptr;
}

/// Empty when the table can be used.
std::string table_defect(const pastern_hal* table) {
  const std::string wanted = std::to_string(PASTERN_HAL_VERSION);
  if (table == nullptr) {
    return "does not serve interface version " + wanted;
  }
  // struct_size says how much of the table may be looked at: nothing behind it before it is known.
  if (table->version != PASTERN_HAL_VERSION) {
    return "found interface version " + std::to_string(table->version) + ", expected " + wanted;
  }
  if (table->struct_size != sizeof(pastern_hal)) {
    return "found a function table of " + std::to_string(table->struct_size) + " bytes, expected " +
           std::to_string(sizeof(pastern_hal));
  }
  if (table->name == nullptr || table->name[0] == '\0') {
    return "has no name, expected one in the function table";
  }
  if (const char* missing = missing_function(*table); missing != nullptr) {
    return std::string("has no ") + missing + " function, expected one";
  }
  return {};
}

std::string config_defect(const DrivesConfig& config) {
  const std::size_t count = config.joint_names.size();
  if (count == 0 || count > PASTERN_HAL_MAX_JOINTS) {
    return "found " + std::to_string(count) + " joints, expected 1 to " +
           std::to_string(PASTERN_HAL_MAX_JOINTS);
  }
  if (!(config.period_s > 0) || !(config.drive_timeout_s > 0)) {
    return "found a period or a drive timeout that is not above 0 s";
  }
  return {};
}

std::string loader_words() {
  const char* words = dlerror();
  return words == nullptr ? "no reason given" : one_line(words, 512);
}

template <class Target>
void copy_joints(Target& target, const double* source, std::int32_t count) noexcept {
  for (std::int32_t j = 0; j < count; ++j) {
    target[j] = source[j];
  }
}

void copy_frame(const pastern_hal_frame& from, safety::SensorFrame& to) noexcept {
  const auto count = static_cast<std::int32_t>(from.joint_count);
  to.counter = from.counter;
  to.time = {from.time_ns};
  to.joint_count = count;
  copy_joints(to.angle, from.angle_rad, count);
  copy_joints(to.speed, from.speed_rad_s, count);
  copy_joints(to.torque, from.torque_nm, count);
  copy_joints(to.winding, from.winding_c, count);
  copy_joints(to.housing, from.housing_c, count);
  to.rate = {from.rate_rad_s[0], from.rate_rad_s[1], from.rate_rad_s[2]};
  to.acceleration = {from.acceleration_m_s2[0], from.acceleration_m_s2[1], from.acceleration_m_s2[2]};
  to.has_attitude = from.has_attitude != 0;
  to.attitude = {from.attitude_wxyz[0], from.attitude_wxyz[1], from.attitude_wxyz[2], from.attitude_wxyz[3]};
  to.has_position = from.has_position != 0;
  to.position = {from.position_m[0], from.position_m[1], from.position_m[2]};
  to.pack_voltage_v = from.pack_voltage_v;
  to.pack_current_a = from.pack_current_a;
  to.emergency_stop = from.emergency_stop != 0;
}

/// A drive that ignores torque_on must find no torque either.
void copy_command(const safety::DriveCommand& from, bool torque_on, std::int32_t count,
                  pastern_hal_command& to) noexcept {
  to.struct_size = sizeof(to);
  to.joint_count = static_cast<std::uint32_t>(count);
  to.tick = from.tick();
  to.torque_on = torque_on ? 1 : 0;
  for (std::int32_t j = 0; j < safety::kMaxJoints; ++j) {
    to.torque_nm[j] = torque_on && j < count ? from.torque()[j] : 0.0;
  }
}

}  // namespace

Drives::Drives() : impl_(std::make_unique<Impl>()) {}
Drives::~Drives() = default;

std::unique_ptr<Drives> Drives::open(const DrivesConfig& config, std::string& error) {
  error = config_defect(config);
  if (!error.empty()) {
    error = refusal(config.plugin, error);
    return nullptr;
  }
  std::unique_ptr<Drives> drives(new Drives());
  Impl& impl = *drives->impl_;
  impl.library = dlopen(config.plugin.c_str(), RTLD_NOW | RTLD_LOCAL);
  if (impl.library == nullptr) {
    error = refusal(config.plugin, "cannot be loaded: " + loader_words());
    return nullptr;
  }
  // POSIX guarantees that a pointer from dlsym may be called as a function.
  const auto entry = reinterpret_cast<pastern_hal_entry_fn>(dlsym(impl.library, "pastern_hal_entry"));
  if (entry == nullptr) {
    error = refusal(config.plugin, "has no symbol pastern_hal_entry, expected a plug-in of this interface");
    return nullptr;
  }
  const pastern_hal* table = entry(PASTERN_HAL_VERSION);
  if (const std::string defect = table_defect(table); !defect.empty()) {
    error = refusal(config.plugin, defect);
    return nullptr;
  }
  std::vector<const char*> names;
  for (const std::string& name : config.joint_names) {
    names.push_back(name.c_str());
  }
  pastern_hal_config c_config{};
  c_config.struct_size = sizeof(c_config);
  c_config.joint_count = static_cast<std::uint32_t>(names.size());
  c_config.joint_names = names.data();
  c_config.period_s = config.period_s;
  c_config.drive_timeout_s = config.drive_timeout_s;
  c_config.robot_file = config.robot_file.c_str();
  c_config.options = config.options.c_str();
  c_config.seed = config.seed;
  c_config.stepped = config.stepped ? 1 : 0;
  std::array<char, 512> words{};
  impl.table = table;
  impl.handle = table->open(&c_config, words.data(), words.size());
  if (impl.handle == nullptr) {
    const std::string said = one_line(words.data(), words.size());
    error = refusal(config.plugin, "refused to open: " + (said.empty() ? "no reason given" : said));
    return nullptr;
  }
  impl.name = one_line(table->name, 80);
  const char* about = table->about != nullptr ? table->about(impl.handle) : nullptr;
  if (about != nullptr) impl.about = one_line(about, kLongestAbout);
  impl.joint_count = static_cast<std::int32_t>(names.size());
  return drives;
}

ReadResult Drives::read(safety::SensorFrame& frame) noexcept {
  Impl& impl = *impl_;
  impl.own_text[0] = '\0';
  impl.frame.struct_size = sizeof(impl.frame);
  const int result = impl.table->read(impl.handle, &impl.frame);
  if (result == PASTERN_HAL_NO_FRAME) {
    return ReadResult::none;
  }
  if (result != PASTERN_HAL_OK) {
    return ReadResult::failed;
  }
  if (impl.frame.joint_count != static_cast<std::uint32_t>(impl.joint_count)) {
    (void)std::snprintf(impl.own_text.data(), impl.own_text.size(), "frame: found %u joints, expected %d",
                        impl.frame.joint_count, impl.joint_count);
    return ReadResult::failed;
  }
  copy_frame(impl.frame, frame);
  return ReadResult::fresh;
}

bool Drives::write(const safety::DriveCommand& command) noexcept {
  Impl& impl = *impl_;
  impl.own_text[0] = '\0';
  const bool fits = command.joint_count() == impl.joint_count;
  copy_command(command, fits && command.torque_on(), impl.joint_count, impl.command);
  const bool written = impl.table->write(impl.handle, &impl.command) == PASTERN_HAL_OK;
  if (command.torque_on() && !fits) {
    (void)std::snprintf(impl.own_text.data(), impl.own_text.size(),
                        "command: found %d joints, expected %d; torque off was written",
                        command.joint_count(), impl.joint_count);
    return false;
  }
  return written;
}

const char* Drives::error_text() noexcept {
  if (impl_->own_text[0] != '\0') {
    return impl_->own_text.data();
  }
  const char* text = impl_->table->error_text(impl_->handle);
  if (text == nullptr || text[0] == '\0') {
    return "the plug-in gave no reason";
  }
  (void)std::snprintf(impl_->own_text.data(), impl_->own_text.size(), "%s", text);
  for (char& letter : impl_->own_text) {
    letter = letter != '\0' && is_control(letter) ? ' ' : letter;
  }
  return impl_->own_text.data();
}

bool Drives::simulated() const noexcept { return impl_->table->simulated != 0; }

const std::string& Drives::name() const noexcept { return impl_->name; }

const std::string& Drives::about() const noexcept { return impl_->about; }

bool Drives::save(std::string& state) {
  if (impl_->table->save == nullptr) {
    return false;
  }
  // The first call asks for the size; the second may not need more than the first said.
  std::size_t length = 0;
  std::string buffer;
  for (int attempt = 0; attempt < 2; ++attempt) {
    length = 0;
    const int result = impl_->table->save(impl_->handle, buffer.data(), buffer.size(), &length);
    if (result == PASTERN_HAL_OK && length <= buffer.size()) {
      buffer.resize(length);
      state = std::move(buffer);
      return true;
    }
    if (length <= buffer.size() || length > kMostStateBytes) {
      return false;
    }
    buffer.resize(length);
  }
  return false;
}

bool Drives::restore(const std::string& state) {
  return impl_->table->restore != nullptr &&
         impl_->table->restore(impl_->handle, state.data(), state.size()) == PASTERN_HAL_OK;
}

bool Drives::carry_back(std::uint64_t draw) {
  return impl_->table->carry_back != nullptr &&
         impl_->table->carry_back(impl_->handle, draw) == PASTERN_HAL_OK;
}

}  // namespace pastern::hal
