// What the simulated robot's sensors tell: sampled truth, late by the site's delay, with noise, and spoiled
// by faults.
#include <algorithm>
#include <cmath>
#include <limits>

#include "hal_stub/robot/period.h"
#include "hal_stub/robot/random.h"
#include "hal_stub/robot/simulated_robot.h"

namespace pastern::stub {
namespace {

/// Rough normals of one tick, one after another.
class Noise {
 public:
  Noise(std::uint64_t seed, std::uint64_t draw, std::uint64_t tick)
      : seed_(seed), draw_(draw), tick_(static_cast<std::uint32_t>(tick)) {}
  double next() {
    if (used_ == 4) {
      words_ = random_words(seed_, draw_, tick_, Chance::sensors, part_++);
      used_ = 0;
    }
    return rough_normal_of(words_[used_++]);
  }

 private:
  std::uint64_t seed_;
  std::uint64_t draw_;
  std::uint32_t tick_;
  std::uint32_t part_{0};
  std::size_t used_{4};
  Words words_{};
};

std::uint32_t low(std::uint64_t tick) { return static_cast<std::uint32_t>(tick); }

}  // namespace

void SimulatedRobot::sample() {
  Sample& s = samples_[static_cast<std::size_t>(++clock_.samples) % samples_.size()];
  const auto& tree = model_->figures().tree;
  s.number = clock_.samples;
  s.tick = clock_.tick;
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      const auto j = static_cast<std::size_t>(tree.leg[l].joint[i].order);
      const bool loose = site_.backlash_rad[j] > 0;  // the encoder sits on the drive's side of the gap
      s.angle[j] = loose ? state_.drives.rotor_angle[j] : state_.body.angle[l][i];
      s.speed[j] = loose ? state_.drives.rotor_speed[j] : state_.body.speed[l][i];
      s.torque[j] = state_.drives.torque[j];
      s.winding[j] = state_.drives.winding[j];
      s.housing[j] = state_.drives.housing[j];
    }
  }
  s.rate = state_.body.rate;
  const double* a = work_.body.acceleration;
  const Vec3<double> up = turn_back(rotation_of(state_.body.attitude), Vec3<double>{0, 0, tree.gravity});
  const bool moved = clock_.tick > clock_.placed;
  s.acceleration = moved ? Vec3<double>{a[3], a[4], a[5]} - work_.body.gravity : up;
  s.position = state_.body.position;
  s.voltage = state_.pack.voltage;
  s.current = state_.pack.current;
}

void SimulatedRobot::add_noise(const Sample& from, safety::SensorFrame& frame) const {
  const auto& sensors = model_->sensors();
  const double k = site_.sensor_noise_ratio;
  Noise noise(seed_, clock_.draw, from.tick - clock_.placed);
  const double step = sensors.encoder_step_rad();
  const double per_step = step > 0 ? 1 / step : 0;
  for (int joint = 0; joint < model_->joint_count(); ++joint) {
    const auto j = static_cast<std::size_t>(joint);
    const double angle =
        from.angle[j] + site_.zero_offset_rad[j] + k * sensors.angle_noise_rad() * noise.next();
    frame.angle[joint] = step > 0 ? quantised(angle, step, per_step) : angle;
    frame.speed[joint] = from.speed[j] + k * sensors.speed_noise_rad_per_s() * noise.next();
    frame.torque[joint] = from.torque[j] + k * sensors.torque_noise_nm() * noise.next();
    frame.winding[joint] = from.winding[j];
    frame.housing[joint] = from.housing[j];
  }
  const Vec3<double> rate = turn_back(imu_axes_, from.rate) + rate_bias_;
  const Vec3<double> force = turn_back(imu_axes_, from.acceleration);
  const double rn = k * sensors.rate_noise_rad_per_s();
  const double an = k * sensors.acceleration_noise_m_per_s2();
  const double rr = sensors.rate_range_rad_per_s();
  const double ar = sensors.acceleration_range_m_per_s2();
  frame.rate.x = saturated(rate.x + rn * noise.next(), rr);
  frame.rate.y = saturated(rate.y + rn * noise.next(), rr);
  frame.rate.z = saturated(rate.z + rn * noise.next(), rr);
  frame.acceleration.x = saturated(force.x + an * noise.next(), ar);
  frame.acceleration.y = saturated(force.y + an * noise.next(), ar);
  frame.acceleration.z = saturated(force.z + an * noise.next(), ar);
}

/// What was sampled `lag` samplings ago; just after placing, the oldest since then.
const SimulatedRobot::Sample& SimulatedRobot::sampled(std::uint64_t lag) const {
  const std::uint64_t number = clock_.samples > lag ? clock_.samples - lag : 1;
  const Sample& found = samples_[static_cast<std::size_t>(number) % samples_.size()];
  if (found.tick >= clock_.placed) return found;
  return samples_[static_cast<std::size_t>(clock_.samples) % samples_.size()];
}

bool SimulatedRobot::read(safety::SensorFrame& frame) {
  if (!bus_sound() || faulty(v1::Fault::FRAMES_LOST)) return false;
  if (clock_.samples == clock_.asked) return false;
  clock_.asked = clock_.samples;
  FrameNews news;
  if (flaws_.any()) news = news_of(flaws_, seed_, clock_.draw, low(clock_.tick - clock_.placed));
  const std::uint64_t newest = clock_.samples - news.age;
  if (newest == clock_.told && !news.again) return false;
  clock_.told = newest;
  const Sample* from = &sampled(encoder_lag_ + news.age);
  Sample mixed;
  if (imu_lag_ != encoder_lag_) {
    mixed = *from;
    const Sample& felt = sampled(imu_lag_ + news.age);
    mixed.rate = felt.rate;
    mixed.acceleration = felt.acceleration;
    from = &mixed;
  }
  if (faulty(v1::Fault::FRAMES_FROZEN)) {
    if (kept_.is_frozen == 0) kept_.frozen = *from;
    kept_.is_frozen = 1;
    from = &kept_.frozen;
  } else {
    kept_.is_frozen = 0;
  }
  answered_.angle = from->angle;
  answered_.speed = from->speed;
  frame.counter = newest;
  frame.time.value = std::llround(static_cast<double>(clock_.tick - news.age) * model_->period_s() * 1e9);
  frame.joint_count = model_->joint_count();
  add_noise(*from, frame);
  frame.has_attitude = false;
  frame.has_position = site_.position_source;
  if (frame.has_position) frame.position = {from->position.x, from->position.y, from->position.z};
  frame.pack_voltage_v = from->voltage;
  frame.pack_current_a = from->current;
  frame.emergency_stop = faulty(v1::Fault::EMERGENCY_STOP);
  if (site_.fault_count > 0) spoil(frame);
  return true;
}

void SimulatedRobot::spoil(safety::SensorFrame& frame) {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  std::array<bool, safety::kMaxJoints> stuck{};
  for (std::size_t i = 0; i < static_cast<std::size_t>(site_.fault_count); ++i) {
    const Fault& fault = site_.fault[i];
    if (!acts(fault)) continue;
    if (fault.kind == v1::Fault::RATE_NAN) frame.rate.x = nan;
    if (fault.kind == v1::Fault::ACCELERATION_NAN) frame.acceleration.z = nan;
    for (int joint = 0; joint < model_->joint_count(); ++joint) {
      if (fault.joint >= 0 && fault.joint != joint) continue;
      const auto j = static_cast<std::size_t>(joint);
      if (fault.kind == v1::Fault::ANGLE_NAN) frame.angle[joint] = nan;
      if (fault.kind == v1::Fault::ANGLE_JUMP) frame.angle[joint] += fault.size;
      if (fault.kind == v1::Fault::SPEED_NAN) frame.speed[joint] = nan;
      if (fault.kind == v1::Fault::TORQUE_SENSE_HIGH) frame.torque[joint] += fault.size;
      if (fault.kind != v1::Fault::ANGLE_STUCK) continue;
      stuck[j] = true;
      if (kept_.is_stuck[j] == 0) kept_.stuck[j] = frame.angle[joint];
      frame.angle[joint] = kept_.stuck[j];
    }
  }
  for (std::size_t j = 0; j < safety::kMaxJoints; ++j) kept_.is_stuck[j] = stuck[j] ? 1 : 0;
}

}  // namespace pastern::stub
