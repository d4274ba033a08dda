// The simulated robot in time: placing it, commands on the bus, drives by themselves, faults, one period.
// Sensors are in simulated_sensors.cpp, saving in simulated_save.cpp.
#include "hal_stub/robot/simulated_robot.h"

#include <algorithm>
#include <cmath>

#include "hal_stub/robot/random.h"

namespace pastern::stub {
namespace {

constexpr double kLetGoAfterSeconds = 0.5;    // of damping by the drives themselves
constexpr double kPushSeconds = 0.1;          // a push lasts
constexpr double kPushEarliestSeconds = 0.5;  // since a walk could begin
constexpr double kPushLatestSeconds = 4.5;
constexpr double kFallTilt = 34.0 * std::numbers::pi / 180;

std::uint32_t low(std::uint64_t tick) { return static_cast<std::uint32_t>(tick); }

/// Rotation by a rotation vector.
Rotation<double> rotation_by(const std::array<double, 3>& v) {
  const double angle = std::sqrt(v[0] * v[0] + v[1] * v[1] + v[2] * v[2]);
  const double k = angle > 0 ? std::sin(angle / 2) / angle : 0.5;
  return rotation_of(Quat<double>{std::cos(angle / 2), v[0] * k, v[1] * k, v[2] * k});
}

/// The trunk with a point load rigidly on it.
TrunkFigures<double> loaded_trunk(const LinkFigures<double>& trunk, double load,
                                  const std::array<double, 3>& at) {
  const Vec3<double> where{at[0], at[1], at[2]};
  const double mass = trunk.mass + load;
  const Vec3<double> centre = (trunk.centre * trunk.mass + where * load) * (1 / mass);
  const Vec3<double> d = where - trunk.centre;
  const double m =
      trunk.mass * load / mass;  // reduced mass: parallel-axis terms of both about the common centre
  const auto& i = trunk.inertia;
  return {
      mass,
      centre,
      {i.xx + m * (d.y * d.y + d.z * d.z), i.yy + m * (d.x * d.x + d.z * d.z),
       i.zz + m * (d.x * d.x + d.y * d.y), i.xy - m * d.x * d.y, i.xz - m * d.x * d.z, i.yz - m * d.y * d.z}};
}

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
  const auto& base = model_->figures();
  auto& around = figures_.around;
  around.trunk = loaded_trunk(base.tree.trunk, site_.load_kg, site_.load_at_m);
  around.ground = {{-std::sin(site_.slope_rad), 0, std::cos(site_.slope_rad)},
                   site_.friction,
                   site_.ground_stiffness_n_per_m,
                   site_.ground_damping_n_s_per_m};
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    figures_.drives.strength[j] = site_.strength[j];
    figures_.drives.damping[j] = site_.damping_nm_s_per_rad[j];
    figures_.drives.coulomb[j] = site_.coulomb_nm[j];
    figures_.drives.half_gap[j] = site_.backlash_rad[j] / 2;
  }
  figures_.drives.ambient = site_.ambient_c;
  figures_.pack.resistance = base.pack.resistance * site_.pack_resistance_ratio;
  stepper_.take_site(figures_);
  imu_axes_ = rotation_by(site_.imu_tilt_rad);
  const double late = (site_.command_delay_s + site_.command_jitter_s) / model_->period_s();
  command_rows_ = static_cast<std::size_t>(std::ceil(late)) + 3;
  if (commands_.size() < command_rows_) commands_.resize(command_rows_);
  if (command_ticks_.size() < command_rows_) command_ticks_.resize(command_rows_);
  const auto rows = static_cast<std::size_t>(std::lround(site_.sensor_delay_s / model_->period_s())) + 1;
  samples_.resize(rows);
}

void SimulatedRobot::switch_on() {
  state_ = {};
  clock_ = {};
  kept_ = {};
  told_ = {};
  const double ratio = site_.pack_voltage_ratio;
  state_.pack.charge = std::clamp(0.7 + 1.5 * (ratio - 1), 0.15, 1.0);
  state_.pack.voltage = ratio * model_->figures().pack.nominal;
  figures_.pack.open_scale = state_.pack.voltage / open_voltage(state_.pack.charge);
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    state_.drives.winding[j] = site_.winding_start_c;
    state_.drives.housing[j] = site_.winding_start_c;
  }
  const double sd = model_->sensors().rate_bias_rad_per_s() * site_.sensor_noise_ratio;
  const Words a = random_words(seed_, 0, 0, Chance::robot, 0);
  const Words b = random_words(seed_, 0, 0, Chance::robot, 1);
  rate_bias_ = {sd * normal_of(a[0], a[1]), sd * normal_of(a[2], a[3]), sd * normal_of(b[0], b[1])};
}

void SimulatedRobot::place_standing(std::uint64_t draw) {
  clock_.holding = 1;
  clock_.lying = 0;
  place(model_->stance(), site_.start_scatter_rad, draw);
}

void SimulatedRobot::place_lying(std::uint64_t draw) {
  clock_.holding = 0;
  clock_.lying = 1;
  place(model_->lying(), site_.start_scatter_rad, draw);
}

void SimulatedRobot::place(const std::vector<double>& pose, double scatter, std::uint64_t draw) {
  clock_.placed = clock_.tick;
  clock_.draw = draw;
  clock_.told = 0;
  clock_.let_go = 0;
  told_.on = told_.damping = 0;
  clock_.sent = clock_.acting = clock_.arrived = -1;
  std::fill(command_ticks_.begin(), command_ticks_.end(), -1);
  std::array<double, safety::kMaxJoints> angle{};
  const auto& tree = model_->figures().tree;
  state_.body = {};
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      const auto& joint = tree.leg[l].joint[i];
      const auto j = static_cast<std::size_t>(joint.order);
      const Words w = random_words(seed_, draw, 0, Chance::place, static_cast<std::uint32_t>(j) + 1);
      angle[j] = std::clamp(pose[j] + scatter * normal_of(w[0], w[1]), joint.angle_min, joint.angle_max);
      state_.body.angle[l][i] = angle[j];
      state_.drives.rotor_angle[j] = angle[j];
      state_.drives.rotor_speed[j] = 0;
      state_.drives.torque[j] = 0;
    }
  }
  const Words w = random_words(seed_, draw, 0, Chance::place, 0);
  const double yaw = scatter * normal_of(w[0], w[1]);
  const double half = -site_.slope_rad / 2;  // nose up the slope
  const Quat<double> slope{std::cos(half), 0, std::sin(half), 0};
  state_.body.attitude = slope * Quat<double>{std::cos(yaw / 2), 0, 0, std::sin(yaw / 2)};
  const double sink =
      model_->mass_kg() * tree.gravity / site_.ground_stiffness_n_per_m / std::max(1, tree.leg_count);
  const double height = reach_below(tree, angle.data(), {0, 0, -1}) - sink;
  state_.body.position = figures_.around.ground.normal * height;
  const Words p = random_words(seed_, draw, 0, Chance::push, 0);
  const Words q = random_words(seed_, draw, 0, Chance::push, 1);
  const double mass = model_->mass_kg() + site_.load_kg;
  const double size = site_.push_m_per_s * normal_of(p[0], p[1]) * mass / kPushSeconds;
  const double way = 2 * std::numbers::pi * uniform_of(p[2]);
  push_ = {size * std::cos(way), size * std::sin(way), 0};
  push_begins_s_ = kPushEarliestSeconds + (kPushLatestSeconds - kPushEarliestSeconds) * uniform_of(q[0]) +
                   (clock_.lying != 0 ? model_->rise_s() : 0);
  work_ = {};
  work_.body.acceleration[5] = 0;
  sample();
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
  double late = site_.command_delay_s;
  if (site_.command_jitter_s > 0) {
    const Words w = random_words(seed_, clock_.draw, low(clock_.tick - clock_.placed), Chance::jitter, 0);
    late += site_.command_jitter_s * uniform_of(w[0]);
  }
  const auto now = static_cast<std::int64_t>(clock_.tick);
  const std::int64_t newest = now - std::lround(late / model_->period_s());
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

/// NaN becomes 0.
double SimulatedRobot::bounded(std::size_t joint, double torque) const {
  const double most = model_->envelope()[joint];
  if (torque > most) return most;
  return torque >= -most ? torque : (torque < -most ? -most : 0.0);
}

void SimulatedRobot::hold_stance() {
  told_.on = 1;
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    told_.wanted[j] =
        bounded(j, model_->hold_stiffness()[j] * (model_->stance()[j] - state_.drives.rotor_angle[j]) -
                       model_->hold_damping()[j] * state_.drives.rotor_speed[j]);
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
    told_.wanted[j] =
        bounded(j, message.torque[j] +
                       model_->hold_stiffness()[j] * (message.angle[j] - state_.drives.rotor_angle[j]) +
                       model_->hold_damping()[j] * (message.speed[j] - state_.drives.rotor_speed[j]));
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
  if (since >= push_begins_s_ && since < push_begins_s_ + kPushSeconds) force = push_;
  for (std::size_t i = 0; i < static_cast<std::size_t>(site_.fault_count); ++i) {
    const Fault& fault = site_.fault[i];
    if (fault.kind != v1::Fault::PUSH || !acts(fault)) continue;
    const double lasts = std::max(fault.ends_s - fault.begins_s, model_->period_s());
    force.y += (model_->mass_kg() + site_.load_kg) * fault.size / lasts;  // to the left
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
  const auto& tree = model_->figures().tree;
  for (const double grip : state_.body.grip.corner) {
    if (grip > 0) return true;
  }
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    if (state_.body.grip.leg[l][1] > 0) return true;
  }
  const auto& q = state_.body.attitude;
  const double upright = 1 - 2 * (q.x * q.x + q.y * q.y);
  const double height = dot(figures_.around.ground.normal, state_.body.position);
  return !(upright > std::cos(kFallTilt)) || !(height > model_->stance_height_m() / 2);
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
  t.height_m = dot(figures_.around.ground.normal, body.position);
  for (const double grip : body.grip.corner) t.other_contact = t.other_contact || grip > 0;
  for (const auto& leg : body.grip.leg) t.other_contact = t.other_contact || leg[1] > 0;
  t.fallen = fallen();
  t.power_w = work_.mechanical;
  return t;
}

}  // namespace pastern::stub
