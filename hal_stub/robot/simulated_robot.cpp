// The simulated robot in time: placing it, commands on the bus, drives by themselves, faults, one period.
// Sensors are in simulated_sensors.cpp, saving in simulated_save.cpp.
#include "hal_stub/robot/simulated_robot.h"

#include <algorithm>
#include <cmath>

#include "hal_stub/robot/period.h"
#include "hal_stub/robot/random.h"
#include "hal_stub/robot/start.h"

namespace pastern::stub {
namespace {

std::uint32_t low(std::uint64_t tick) { return static_cast<std::uint32_t>(tick); }

}  // namespace

SimulatedRobot::SimulatedRobot(std::shared_ptr<const Model> model, const Site& site, std::uint64_t seed)
    : model_(std::move(model)), stepper_(model_->figures()) {
  renew(site, seed);
}

void SimulatedRobot::renew(const Site& site, std::uint64_t seed) {
  site_ = site;
  seed_ = seed;
  take_site();
  switch_on();
  place_lying(0);
}

void SimulatedRobot::take_site() {
  figures_ = figures_of(*model_, site_);
  stepper_.take_site(figures_);
  imu_axes_ = imu_axes_of(site_);
  const double late = (site_.command_delay_s + site_.command_jitter_s) / model_->period_s();
  command_rows_ = static_cast<std::size_t>(std::ceil(late)) + 3;
  if (commands_.size() < command_rows_) commands_.resize(command_rows_);
  if (command_ticks_.size() < command_rows_) command_ticks_.resize(command_rows_);
  flaws_ = frame_flaws_of(*model_, site_);
  encoder_lag_ = sensor_delay_ticks(*model_, site_);
  imu_lag_ = imu_delay_ticks(*model_, site_);
  samples_.resize(oldest_sample_ticks(*model_, site_) + 1);
}

void SimulatedRobot::switch_on() {
  state_ = stub::switch_on(*model_, site_, figures_.pack);
  clock_ = {};
  kept_ = {};
  told_ = {};
  rate_bias_ = rate_bias_of(*model_, site_, seed_);
}

void SimulatedRobot::place_standing(std::uint64_t draw) {
  clock_.holding = 1;
  clock_.lying = 0;
  place(model_->stance(), draw);
}

void SimulatedRobot::place_lying(std::uint64_t draw) {
  clock_.holding = 0;
  clock_.lying = 1;
  place(model_->lying(), draw);
}

void SimulatedRobot::place(const std::vector<double>& pose, std::uint64_t draw) {
  clock_.placed = clock_.tick;
  clock_.draw = draw;
  clock_.told = clock_.asked = 0;
  clock_.let_go = 0;
  told_.on = told_.damping = 0;
  clock_.sent = clock_.acting = clock_.arrived = -1;
  std::fill(command_ticks_.begin(), command_ticks_.end(), -1);
  place_in(*model_, site_, pose, seed_, draw, state_);
  const Push push = push_of(*model_, site_, seed_, draw);
  push_ = push.force;
  push_begins_s_ = push.begins_s + (clock_.lying != 0 ? model_->rise_s() : 0);
  work_ = {};
  work_.body.acceleration[5] = 0;
  sample();
  // Until newer samplings arrive over a slow bus it tells of the mark that the robot was placed on.
  const Sample first = samples_[static_cast<std::size_t>(clock_.samples) % samples_.size()];
  for (Sample& row : samples_) row = first;
}

void SimulatedRobot::command(const safety::Torques<>& torque, bool torque_on) {
  if (!bus_sound()) return;
  const auto tick = static_cast<std::int64_t>(clock_.tick);
  const auto row = static_cast<std::size_t>(tick) % command_rows_;
  Message& message = commands_[row];
  if (clock_.told == 0) {  // nobody reads: the command answers what is so now
    answered_.angle = state_.drives.rotor_angle;
    answered_.speed = state_.drives.rotor_speed;
  }
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    const double wanted = torque.values[j];
    message.torque[j] = std::isfinite(wanted) ? wanted : 0;
    message.angle[j] = answered_.angle[j];
    message.speed[j] = answered_.speed[j];
  }
  message.on = torque_on ? 1 : 0;
  command_ticks_[row] = tick;
  clock_.sent = tick;
}

/// The newest command that has come over the bus by now; what came late is overtaken by what came after.
void SimulatedRobot::hear() {
  double chance = 0;
  if (site_.command_jitter_s > 0) {
    const Words w = random_words(seed_, clock_.draw, low(clock_.tick - clock_.placed), Chance::jitter, 0);
    chance = uniform_of(w[0]);
  }
  const auto now = static_cast<std::int64_t>(clock_.tick);
  const std::int64_t newest = now - command_delay_ticks(*model_, site_, chance);
  for (std::int64_t tick = newest;
       tick > clock_.acting && tick > now - static_cast<std::int64_t>(command_rows_); --tick) {
    if (tick < 0) break;
    if (command_ticks_[static_cast<std::size_t>(tick) % command_rows_] != tick) continue;
    clock_.acting = tick;
    clock_.arrived = now;
    clock_.holding = 0;
    break;
  }
}

Hold<double> SimulatedRobot::hold_of(std::size_t joint) const {
  return {model_->hold_stiffness()[joint], model_->hold_damping()[joint], model_->envelope()[joint]};
}

void SimulatedRobot::hold_stance() {
  told_.on = 1;
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    told_.wanted[j] = corrected(hold_of(j), 0.0, {model_->stance()[j], 0.0},
                                {state_.drives.rotor_angle[j], state_.drives.rotor_speed[j]});
  }
}

void SimulatedRobot::tell_drives() {
  told_.on = 0;
  told_.damping = 0;
  told_.forced.fill(0);
  if (clock_.holding != 0) return hold_stance();
  if (clock_.acting < 0) return;
  const Message& message = commands_[static_cast<std::size_t>(clock_.acting) % command_rows_];
  const double silent =
      static_cast<double>(static_cast<std::int64_t>(clock_.tick) - clock_.arrived) * model_->period_s();
  if (!(message.on > 0)) {
    clock_.let_go = 0;
    return;
  }
  // A program that was stopped and goes on sends a torque that is long out of date: it must ask anew.
  if (silent > model_->drive_timeout_s() + kLetGoAfterSeconds + 1e-9) clock_.let_go = 1;
  if (clock_.let_go != 0) return;
  if (silent > model_->drive_timeout_s() + 1e-9) {
    told_.damping = 1;
    return;
  }
  told_.on = 1;
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    told_.wanted[j] = corrected(hold_of(j), message.torque[j], {message.angle[j], message.speed[j]},
                                {state_.drives.rotor_angle[j], state_.drives.rotor_speed[j]});
  }
}

bool SimulatedRobot::acts(const Fault& fault) const {
  const double now = time_s();
  return now >= fault.begins_s - 1e-9 && now < fault.ends_s - 1e-9;
}

bool SimulatedRobot::faulty(v1::Fault::Kind kind) const {
  for (std::size_t i = 0; i < static_cast<std::size_t>(site_.fault_count); ++i) {
    if (site_.fault[i].kind == kind && acts(site_.fault[i])) return true;
  }
  return false;
}

void SimulatedRobot::apply_drive_fault(const Fault& fault) {
  for (int joint = 0; joint < model_->joint_count(); ++joint) {
    if (fault.joint >= 0 && fault.joint != joint) continue;
    const auto j = static_cast<std::size_t>(joint);
    if (fault.kind == v1::Fault::DRIVE_DEAD) told_.wanted[j] = 0;
    if (fault.kind == v1::Fault::DRIVE_RUNAWAY && told_.on > 0) {
      told_.wanted[j] = 0;
      told_.forced[j] = fault.size;
    }
    if (fault.kind == v1::Fault::WINDING_HOT) state_.drives.winding[j] = fault.size;
  }
}

void SimulatedRobot::apply_faults() {
  for (std::size_t i = 0; i < static_cast<std::size_t>(site_.fault_count); ++i) {
    const Fault& fault = site_.fault[i];
    if (!acts(fault)) continue;
    apply_drive_fault(fault);
    if (fault.kind == v1::Fault::EMERGENCY_STOP) {
      told_.on = 0;
      told_.damping = 0;
      told_.forced.fill(0);
    }
    if (fault.kind == v1::Fault::PACK_CUT) state_.pack.voltage = 0;
  }
}

Vec3<double> SimulatedRobot::push_now() const {
  Vec3<double> force{0, 0, 0};
  const double since = static_cast<double>(clock_.tick - clock_.placed) * model_->period_s();
  if (pushes(push_begins_s_, since)) force = push_;
  for (std::size_t i = 0; i < static_cast<std::size_t>(site_.fault_count); ++i) {
    const Fault& fault = site_.fault[i];
    if (fault.kind != v1::Fault::PUSH || !acts(fault)) continue;
    const double lasts = std::max(fault.ends_s - fault.begins_s, model_->period_s());
    force.y += mass_at(*model_, site_) * fault.size / lasts;  // to the left
  }
  return force;
}

void SimulatedRobot::step() {
  const double period = model_->period_s();
  const int substeps = model_->substeps();
  hear();
  for (int n = 0; n < substeps; ++n) {
    tell_drives();
    if (site_.fault_count > 0) apply_faults();
    figures_.around.push = push_now();
    stepper_.step(figures_, told_, period / substeps, state_, work_);
  }
  ++clock_.tick;
  if (faulty(v1::Fault::PACK_CUT)) state_.pack.voltage = state_.pack.current = 0;
  sample();
}

bool SimulatedRobot::bus_sound() const { return !faulty(v1::Fault::BUS_BROKEN); }

TorqueMode SimulatedRobot::torque_mode() const {
  if (told_.on > 0) return TorqueMode::on;
  return told_.damping > 0 ? TorqueMode::damping : TorqueMode::off;
}

double SimulatedRobot::time_s() const { return static_cast<double>(clock_.tick) * model_->period_s(); }

bool SimulatedRobot::fallen() const {
  return stub::fallen(model_->figures().tree, figures_.around.ground, model_->stance_height_m(), state_.body);
}

Truth SimulatedRobot::truth() const {
  const auto& body = state_.body;
  const auto& q = body.attitude;
  Truth t;
  t.attitude_wxyz = {q.w, q.x, q.y, q.z};
  t.position_m = {body.position.x, body.position.y, body.position.z};
  t.velocity_m_per_s = {body.velocity.x, body.velocity.y, body.velocity.z};
  t.rate_rad_per_s = {body.rate.x, body.rate.y, body.rate.z};
  const Rotation<double> r = rotation_of(q);
  t.roll_rad = std::atan2(r.y.z, r.z.z);
  t.pitch_rad = -std::asin(std::clamp(r.x.z, -1.0, 1.0));
  t.yaw_rad = std::atan2(r.x.y, r.x.x);
  t.tilt_rad = std::acos(std::clamp(r.z.z, -1.0, 1.0));
  t.height_m = height_over(figures_.around.ground, body.position);
  t.other_contact = lies(model_->figures().tree, body.grip);
  t.fallen = fallen();
  t.power_w = work_.mechanical;
  return t;
}

}  // namespace pastern::stub
