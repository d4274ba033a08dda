// Robot, policy and cycle for benches.
#include "tests/bench/rig/robot_in_loop.h"

#include <dlfcn.h>

#include <cmath>
#include <cstdio>
#include <cstdlib>

#include "runtime/hal/drives.h"

namespace pastern::bench {
namespace {

[[noreturn]] void give_up(const std::string& words) {
  std::fprintf(stderr, "%s\n", words.c_str());
  std::exit(1);
}

void* plugin_symbol(const char* name) {
  void* const handle = dlopen(looped_plugin().c_str(), RTLD_NOW | RTLD_NOLOAD);
  void* const symbol = handle == nullptr ? nullptr : dlsym(handle, name);
  if (symbol == nullptr) give_up(std::string("the looped plug-in is not loaded or has no ") + name);
  return symbol;
}

void add_channel(v1::Policy& policy, v1::Channel::Kind kind, const std::string& joint = {}) {
  v1::Channel& channel = *policy.add_channels();
  channel.set_kind(kind);
  channel.set_scale(1.0);
  if (!joint.empty()) channel.set_joint(joint);
}

void add_layer(v1::Policy& policy, int inputs, int outputs, v1::Layer::Activation activation) {
  v1::Layer& layer = *policy.add_layers();
  layer.set_inputs(static_cast<std::uint32_t>(inputs));
  layer.set_outputs(static_cast<std::uint32_t>(outputs));
  layer.set_activation(activation);
  layer.set_has_bias(true);
  const int count = inputs * outputs + outputs;
  for (int i = 0; i < count; ++i)
    policy.add_parameters(0.05 * std::sin(1.7 * (policy.parameters_size() + 1)));
}

}  // namespace

files::RobotFile shipped_robot(const std::string& name) {
  files::Defects defects;
  auto robot = files::read_robot(
      std::string(PASTERN_SOURCE_DIR) + "/hal_stub/robots/" + name + ".robot.txtpb", defects);
  if (!robot) give_up(files::lines(defects));
  return *robot;
}

v1::Policy policy_of_fixed_shape(const v1::Robot& robot) {
  v1::Policy policy;
  policy.set_format(1);
  policy.set_name("bench");
  policy.set_robot(robot.name());
  policy.set_scalar(v1::Policy::DOUBLE);
  policy.set_rate_hz(50);
  policy.set_gait_hz(2.5);
  for (const auto kind :
       {v1::Channel::ONE, v1::Channel::ROLL, v1::Channel::PITCH, v1::Channel::ROLL_RATE,
        v1::Channel::PITCH_RATE, v1::Channel::YAW_RATE, v1::Channel::PHASE_SIN, v1::Channel::PHASE_COS}) {
    add_channel(policy, kind);
  }
  for (const v1::Joint& joint : robot.joints()) add_channel(policy, v1::Channel::JOINT_OFFSET, joint.name());
  int actions = 0;
  for (const v1::Leg& leg : robot.legs()) {
    v1::LegAction& action = *policy.add_legs();
    action.set_leg(leg.name());
    action.set_angle_rad(0.2);
    action.set_length_m(0.02);
    action.set_abduction_rad(0.05);
    actions += leg.abduction().empty() ? 2 : 3;
  }
  add_layer(policy, policy.channels_size(), 32, v1::Layer::TANH);
  add_layer(policy, 32, actions, v1::Layer::IDENTITY);
  v1::ParameterGroup& all = *policy.add_groups();
  all.set_name("all");
  all.set_count(static_cast<std::uint32_t>(policy.parameters_size()));
  all.set_perturbation_scale(0.05);
  return policy;
}

std::string looped_options(const v1::Robot& robot) {
  std::string options = "stance=";
  for (int j = 0; j < robot.joints_size(); ++j) {
    options += (j == 0 ? "" : ",") + std::to_string(robot.joints(j).stance_rad());
  }
  return options + ";voltage=" + std::to_string(robot.pack().nominal_voltage_v());
}

std::string looped_plugin() { return PASTERN_LOOPED_HAL; }

std::unique_ptr<session::Cycle> cycle_in_loop(const files::RobotFile& file, session::Pace pace,
                                              bool stalls_pass) {
  v1::Robot robot = file.robot();
  robot.mutable_lane()->set_half_width_m(50);  // where looped frames seem to lead is of no matter
  robot.mutable_lane()->set_length_m(500);
  if (stalls_pass) {
    robot.mutable_guard()->set_overrun_s(1e6);
    robot.mutable_guard()->set_frame_stale_s(1e6);
  }
  hal::DrivesConfig config;
  config.plugin = looped_plugin();
  for (const v1::Joint& joint : robot.joints()) config.joint_names.push_back(joint.name());
  config.period_s = 1.0 / robot.cycle_hz();
  config.robot_file = file.path();
  config.options = looped_options(robot);
  config.stepped = pace == session::Pace::stepped;
  std::string error;
  auto drives = hal::Drives::open(config, error);
  if (!drives) give_up(error);
  return std::make_unique<session::Cycle>(robot, policy_of_fixed_shape(robot), std::move(drives), pace);
}

const looped_times& plugin_times() {
  static const auto* const times = static_cast<const looped_times*>(plugin_symbol("looped_last"));
  return *times;
}

void set_plugin_hook(looped_hook hook) { *static_cast<looped_hook*>(plugin_symbol("looped_on_read")) = hook; }

}  // namespace pastern::bench
