// Robot and policy file -> settings of walks; a lot -> how its walk begins.
#include "tools/packed/walk.h"

#include <algorithm>
#include <cmath>

#include "hal_stub/robot/random.h"
#include "hal_stub/robot/start.h"
#include "runtime/session/blend.h"
#include "tools/packed/narrow.h"

namespace pastern::packed {
namespace {

template <class C>
JointFigures<C> joint_figures(const v1::Joint& joint, const stub::Model& model, std::size_t j,
                              double period_s) {
  const v1::JointGuard& guard = joint.guard();
  JointFigures<C> made;
  made.stiffness = C(joint.stiffness_nm_per_rad());
  made.damping = C(joint.damping_nm_s_per_rad());
  made.hold_stiffness = C(model.hold_stiffness()[j]);
  made.hold_damping = C(model.hold_damping()[j]);
  made.hold_most = C(model.envelope()[j]);
  made.peak = C(guard.peak_torque_nm());
  made.step = C(guard.slew_nm_per_s() * period_s);
  made.angle_min = C(joint.angle_min_rad());
  made.angle_max = C(joint.angle_max_rad());
  made.soft_edge = C(guard.soft_edge_rad());
  made.soft_speed = C(guard.soft_speed_rad_per_s());
  made.speed_max = C(guard.speed_max_rad_per_s());
  made.stance = C(model.stance()[j]);
  return made;
}

template <class C>
WalkFigures<C> walk_figures(const v1::Robot& robot, const stub::Model& model) {
  WalkFigures<C> made;
  made.robot = narrowed<C>(model.figures());
  for (int j = 0; j < robot.joints_size(); ++j) {
    const auto i = static_cast<std::size_t>(j);
    made.joint[i] = joint_figures<C>(robot.joints(j), model, i, model.period_s());
  }
  const double step = model.sensors().encoder_step_rad();
  made.stance_height = C(model.stance_height_m());
  made.lane_half_width = C(robot.lane().half_width_m());
  made.encoder_step = C(step);
  made.encoder_per_step = C(step > 0 ? 1 / step : 0);
  made.rate_range = C(model.sensors().rate_range_rad_per_s());
  made.step = C(model.period_s() / model.substeps());
  return made;
}

/// Ticks of silence that are still no more than `seconds`.
std::uint32_t ticks_within(double seconds, double period_s) {
  return static_cast<std::uint32_t>(std::floor((seconds + 1e-9) / period_s));
}

/// The ticks whose time the push covers, judged as the simulated robot judges them.
void take_push(const WalkSettings& settings, const stub::Site& site, OnMark& robot) {
  const stub::Model& model = *settings.model;
  const stub::Push push = stub::push_of(model, site, robot.seed, robot.draw);
  const double begins_s = push.begins_s + (robot.lying ? model.rise_s() : 0);
  const double period = model.period_s();
  const auto acts = [&](std::uint32_t tick) { return stub::pushes(begins_s, tick * period); };
  auto tick = static_cast<std::uint32_t>(std::max(0.0, begins_s / period - 2));
  while (!acts(tick)) ++tick;
  robot.push = push.force;
  robot.push_first = tick;
  while (acts(tick)) ++tick;
  robot.push_end = tick;
}

}  // namespace

std::shared_ptr<const WalkSettings> walk_settings(const v1::Robot& robot, const v1::Policy& policy,
                                                  double walk_s, std::string& error, double longest_step_s) {
  auto made = std::make_shared<WalkSettings>();
  made->model = stub::Model::make(robot, error, longest_step_s);
  if (!made->model) return nullptr;
  const stub::Model& model = *made->model;
  made->shape = policy::plain_shape(policy, robot);
  made->weights = episode::weights_of(robot);
  made->single = walk_figures<float>(robot, model);
  made->full = walk_figures<double>(robot, model);
  made->period_s = model.period_s();
  made->joint_count = static_cast<std::size_t>(model.joint_count());
  made->substeps = model.substeps();
  const auto ticks = [&robot](double seconds) {
    return static_cast<std::uint32_t>(std::lround(seconds * robot.cycle_hz()));
  };
  made->parked_ticks = ticks(session::kOnTheMark_s);
  made->rise_ticks = ticks(robot.rise_s());
  made->stand_ticks = ticks(session::kStand_s);
  made->ticks = ticks(walk_s);
  made->ticks_per_step = static_cast<std::uint32_t>(std::lround(robot.cycle_hz() / policy.rate_hz()));
  made->timeout_ticks = ticks_within(model.drive_timeout_s(), model.period_s());
  made->let_go_ticks = ticks_within(model.drive_timeout_s() + stub::kLetGoAfterSeconds, model.period_s());
  for (std::uint32_t tick = 0; tick < made->ticks; tick += made->ticks_per_step) {
    const double phase = tick * model.period_s() * made->shape.gait_hz;
    made->phase.push_back(policy::gait_phase(phase - std::floor(phase)));
  }
  return made;
}

OnMark on_mark(const WalkSettings& settings, const stub::Site& site, std::uint64_t seed, std::uint64_t draw) {
  const stub::Model& model = *settings.model;
  OnMark robot;
  robot.seed = seed;
  robot.draw = draw;
  robot.site = stub::figures_of(model, site);
  robot.state = stub::switch_on(model, site, robot.site.pack);
  stub::place_in(model, site, model.lying(), seed, draw, robot.state);
  take_push(settings, site, robot);
  robot.imu_axes = stub::imu_axes_of(site);
  robot.rate_bias = stub::rate_bias_of(model, site, seed);
  robot.zero_offset = site.zero_offset_rad;
  const v1::Sensors& sensors = model.sensors();
  robot.angle_noise = site.sensor_noise_ratio * sensors.angle_noise_rad();
  robot.speed_noise = site.sensor_noise_ratio * sensors.speed_noise_rad_per_s();
  robot.torque_noise = site.sensor_noise_ratio * sensors.torque_noise_nm();
  robot.rate_noise = site.sensor_noise_ratio * sensors.rate_noise_rad_per_s();
  robot.sensor_delay = static_cast<std::uint32_t>(stub::sensor_delay_ticks(model, site));
  robot.imu_delay = static_cast<std::uint32_t>(stub::imu_delay_ticks(model, site));
  robot.oldest_sample = static_cast<std::uint32_t>(stub::oldest_sample_ticks(model, site));
  robot.flaws = stub::frame_flaws_of(model, site);
  robot.command_delay = static_cast<std::uint32_t>(stub::command_delay_ticks(model, site, 0));
  robot.longest_delay = static_cast<std::uint32_t>(stub::command_delay_ticks(model, site, 1));
  robot.command_delay_s = site.command_delay_s;
  robot.command_jitter_s = site.command_jitter_s;
  return robot;
}

void put_on_feet(const WalkSettings& settings, const stub::Site& site, OnMark& robot) {
  const stub::Model& model = *settings.model;
  robot.lying = false;
  stub::place_in(model, site, model.stance(), robot.seed, robot.draw, robot.state);
  take_push(settings, site, robot);
}

std::uint32_t jittered_delay(const WalkSettings& settings, const OnMark& robot, std::uint32_t tick) {
  const stub::Words w = stub::random_words(robot.seed, robot.draw, tick, stub::Chance::jitter, 0);
  stub::Site site;
  site.command_delay_s = robot.command_delay_s;
  site.command_jitter_s = robot.command_jitter_s;
  return static_cast<std::uint32_t>(stub::command_delay_ticks(*settings.model, site, stub::uniform_of(w[0])));
}

#define PASTERN_DECLARE(set)                                                              \
  namespace set {                                                                         \
  std::unique_ptr<Walker> make_lane_walker(std::shared_ptr<const WalkSettings>, Numbers); \
  }
PASTERN_LANES_EACH_SET(PASTERN_DECLARE)
#undef PASTERN_DECLARE

std::unique_ptr<Walker> make_walker(std::shared_ptr<const WalkSettings> settings, InstructionSet set,
                                    Numbers numbers) {
#define PASTERN_TRY(name) \
  if (set == InstructionSet::name) return name::make_lane_walker(std::move(settings), numbers);
  PASTERN_LANES_EACH_SET(PASTERN_TRY)
#undef PASTERN_TRY
  return nullptr;
}

}  // namespace pastern::packed
