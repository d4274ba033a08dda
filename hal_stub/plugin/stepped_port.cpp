// Stepped pace: the simulated robot lives in the plug-in, and time passes only when it is written to.
#include "hal_stub/plugin/frame.h"
#include "hal_stub/plugin/port.h"
#include "hal_stub/plugin/settings.h"

namespace pastern::stub {
namespace {

class SteppedPort final : public Port {
 public:
  SteppedPort(std::unique_ptr<SimulatedRobot> robot, std::string about)
      : robot_(std::move(robot)), about_(std::move(about)) {}

  int read(pastern_hal_frame& frame) override {
    if (!robot_->bus_sound()) return broken();
    if (!robot_->read(frame_)) return PASTERN_HAL_NO_FRAME;
    fill_frame(frame_, frame);
    return PASTERN_HAL_OK;
  }

  int write(const pastern_hal_command& command) override {
    const bool sound = robot_->bus_sound();
    robot_->command(torques_of(command), command.torque_on != 0);
    robot_->step();
    return sound ? PASTERN_HAL_OK : broken();
  }

  bool save(std::string& state) override {
    state = robot_->save();
    return true;
  }

  bool restore(const std::string& state) override { return robot_->restore(state, error_); }

  bool carry_back(std::uint64_t draw) override {
    robot_->place_lying(draw);
    return true;
  }

  const char* about() const override { return about_.c_str(); }

  const char* error_text() const override {
    return broken_ ? "bus broken (a fault of the scenario)" : error_.c_str();
  }

 private:
  int broken() {
    broken_ = true;
    return PASTERN_HAL_FAILED;
  }

  std::unique_ptr<SimulatedRobot> robot_;
  std::string about_;
  safety::SensorFrame frame_;
  bool broken_{false};
  std::string error_;
};

/// True when the caller and the robot file speak of the same joints at the same period.
bool agrees(const pastern_hal_config& config, const Model& model, std::string& error) {
  if (static_cast<int>(config.joint_count) != model.joint_count()) {
    error = "joint_count: found " + std::to_string(config.joint_count) + ", expected " +
            std::to_string(model.joint_count()) + " as in the robot file";
    return false;
  }
  for (std::uint32_t j = 0; j < config.joint_count; ++j) {
    const std::string& expected = model.joint_names()[j];
    if (config.joint_names[j] != expected) {
      error = "joint_names[" + std::to_string(j) + "]: found \"" + config.joint_names[j] + "\", expected \"" +
              expected + "\"";
      return false;
    }
  }
  const double off = config.period_s - model.period_s();
  if (!(off < 1e-9 && off > -1e-9)) {
    error = "period_s: found " + std::to_string(config.period_s) + ", expected " +
            std::to_string(model.period_s());
    return false;
  }
  return true;
}

}  // namespace

std::unique_ptr<Port> stepped_port(const pastern_hal_config& config, const std::string& scenario,
                                   std::string& error) {
  std::string drawn;
  auto robot = robot_from_files(config.robot_file, scenario, config.seed, error, &drawn);
  if (!robot || !agrees(config, robot->model(), error)) return nullptr;
  return std::make_unique<SteppedPort>(std::move(robot), std::move(drawn));
}

}  // namespace pastern::stub
