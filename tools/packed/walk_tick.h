// One tick of all lanes.
#pragma once

#include <algorithm>

#include "hal_stub/robot/period.h"
#include "runtime/control/pd.h"
#include "runtime/episode/recorder.h"
#include "safety/clamps.h"
#include "tools/packed/plane_legs.h"
#include "tools/packed/walk_lanes.h"

namespace pastern::packed::PASTERN_LANES_SET {

/// Sine and cosine of the gait, each lane's own.
template <class S>
struct LanePhase {
  S sine;
  S cosine;
};

template <class C>
inline stub::Hold<C> hold_of(const JointFigures<C>& joint) noexcept {
  return {joint.hold_stiffness, joint.hold_damping, joint.hold_most};
}

template <class S>
unsigned LaneWalker<S>::tick() {
  look();
  if (stands_up_) {
    rise();
  } else if (now_ % settings_->ticks_per_step == 0) {
    steer();
  }
  command();
  hear();
  const auto& figs = figures();
  push();
  for (int n = 0; n < settings_->substeps; ++n) {
    correct();
    if (!stub::as_made(site_)) {
      step_flawed();
    } else if (plane_legs_) {
      step_plane_robot(figs.robot, site_, told_, figs.step, robot_, work_);
    } else {
      stub::step_robot<true>(figs.robot, site_, told_, figs.step, robot_, work_);
    }
  }
  ticks_ = ticks_ + S(T(1));
  ++now_;
  return score();
}

/// The step where some robot is not as made. On its own, so that the others' step is compiled, and rounds, as
/// if there were none.
template <class S>
[[gnu::noinline]] PASTERN_FLATTEN void LaneWalker<S>::step_flawed() {
  stub::step_robot(figures().robot, site_, told_, figures().step, robot_, work_);
}

/// The newest frame: true values, or those of a while ago, with the sensors' errors.
template <class S>
void LaneWalker<S>::look() {
  const auto& figs = figures();
  const W since = W(now_) - placed_;
  W late(0);
  if (slow_bus_) {
    const W age = flawed_ ? age_of_news() : W(0);
    late = least(sample_delay_ + age, since);
    look_back(late, least(imu_delay_ + age, since));
  }
  const bool steers = now_ % settings_->ticks_per_step == 0;
  const auto numbers = static_cast<unsigned>(3 * joints() + (steers ? 3 : 0));
  chance_.draw(since - late, (numbers + 3) / 4, words_.data());
  S power(T(0));
  for (std::size_t j = 0; j < joints(); ++j) {
    const S& angle = slow_bus_ ? seen_angle_[j] : robot_.drives.rotor_angle[j];
    const S& speed = slow_bus_ ? seen_speed_[j] : robot_.drives.rotor_speed[j];
    const S& made = slow_bus_ ? seen_torque_[j] : robot_.drives.torque[j];
    const W* word = words_.data() + 3 * j;
    const S there = angle + own_.zero_offset[j] + own_.angle_noise * rough_normal_of<T>(word[0]);
    angle_.values[j] =
        figs.encoder_step > 0 ? stub::quantised(there, figs.encoder_step, figs.encoder_per_step) : there;
    speed_.values[j] = speed + own_.speed_noise * rough_normal_of<T>(word[1]);
    const S torque = made + own_.torque_noise * rough_normal_of<T>(word[2]);
    power = power + abs(torque * speed_.values[j]);
  }
  power_ = power;
}

/// How old the newest frame is that the bus has told: one who waits sees the frame before, which is the same
/// as an older sampling with its own noise.
template <class S>
auto LaneWalker<S>::age_of_news() const -> W {
  W age(0);
  for (int lane = 0; lane < kLanes; ++lane) {
    const OnMark& mark = mark_[static_cast<std::size_t>(lane)];
    if (!mark.flaws.any()) continue;
    age.put(lane, stub::news_of(mark.flaws, mark.seed, mark.draw, now_ - placed_[lane]).age);
  }
  return age;
}

/// Keeps what is so now and finds what was so `late` ticks ago.
template <class S>
void LaneWalker<S>::look_back(const W& late, const W& imu_late) {
  const std::size_t rate = 3 * joints();
  const std::size_t width = rate + 3;
  S* row = samples_.data() + (now_ & (sample_rows_ - 1)) * width;
  for (std::size_t j = 0; j < joints(); ++j) {
    row[3 * j] = robot_.drives.rotor_angle[j];
    row[3 * j + 1] = robot_.drives.rotor_speed[j];
    row[3 * j + 2] = robot_.drives.torque[j];
  }
  row[rate] = robot_.body.rate.x;
  row[rate + 1] = robot_.body.rate.y;
  row[rate + 2] = robot_.body.rate.z;
  const W at = place_in_ring(W(now_) - late, sample_rows_, width);
  const T* from = reinterpret_cast<const T*>(samples_.data());
  const auto found = [&](std::size_t n) { return gathered(from + n * kLanes, at); };
  for (std::size_t j = 0; j < joints(); ++j) {
    seen_angle_[j] = found(3 * j);
    seen_speed_[j] = found(3 * j + 1);
    seen_torque_[j] = found(3 * j + 2);
  }
  const W felt_at = place_in_ring(W(now_) - imu_late, sample_rows_, width);
  const auto felt = [&](std::size_t n) { return gathered(from + n * kLanes, felt_at); };
  seen_rate_ = {felt(rate), felt(rate + 1), felt(rate + 2)};
}

/// A step of the policy.
template <class S>
void LaneWalker<S>::steer() {
  const stub::Rotation<S> r = stub::rotation_of(robot_.body.attitude);
  body_.roll_rad = atan2(r.y.z, r.z.z) + own_.roll_error;
  body_.pitch_rad = own_.pitch_error - asin(max(min(r.x.z, S(T(1))), S(T(-1))));
  const S yaw = atan2(r.x.y, r.x.x) - own_.yaw;
  body_.yaw_rad = yaw - round_even(yaw * T(1 / (2 * kPi))) * T(2 * kPi);
  const stub::Vec3<S> rate =
      stub::turn_back(own_.imu_axes, slow_bus_ ? seen_rate_ : robot_.body.rate) + own_.rate_bias;
  const W* word = words_.data() + 3 * joints();
  const S range(figures().rate_range);
  body_.rate.x = stub::saturated(rate.x + own_.rate_noise * rough_normal_of<T>(word[0]), range);
  body_.rate.y = stub::saturated(rate.y + own_.rate_noise * rough_normal_of<T>(word[1]), range);
  body_.rate.z = stub::saturated(rate.z + own_.rate_noise * rough_normal_of<T>(word[2]), range);
  LanePhase<S> phase;
  for (int lane = 0; lane < kLanes; ++lane) {
    const std::uint32_t step =
        (now_ - walk_from_[static_cast<std::size_t>(lane)]) / settings_->ticks_per_step;
    const auto& here = settings_->phase[step % settings_->phase.size()];
    phase.sine.put(lane, static_cast<T>(here.sine));
    phase.cosine.put(lane, static_cast<T>(here.cosine));
  }
  target_ = policy::evaluate(shape_, parameters_.data(), scratch_, body_, angle_, speed_, phase);
}

/// The target on the way up, as runtime/session/blend.h has it. Until then no torque is asked for.
template <class S>
void LaneWalker<S>::rise() {
  const S zero(T(0));
  const auto parked = rise_clock_ < zero;
  const auto first =
      rise_clock_ < S(T(1));  // and parked: what they keep is overwritten until the rise begins
  const S t = max(min((rise_clock_ + T(1)) / static_cast<T>(settings_->rise_ticks), S(T(1))), zero);
  const S share = t * t * t * (t * (t * T(6) - T(15)) + T(10));
  const auto up = t >= S(T(1));
  for (std::size_t j = 0; j < joints(); ++j) {
    S& from = rise_from_.values[j];
    from = select(first, angle_.values[j], from);
    const S stance(figures().joint[j].stance);
    target_.angle.values[j] = select(up, stance, from + share * (stance - from));
    torque_.values[j] = select(parked | first, zero, torque_.values[j]);
  }
  rise_clock_ = rise_clock_ + T(1);
}

/// PD and the gate's clamps; the command goes onto the bus with what the frame said of its joint.
template <class S>
void LaneWalker<S>::command() {
  S* row = commands_.data() + (now_ & (command_rows_ - 1)) * joints();
  for (std::size_t j = 0; j < joints(); ++j) {
    const auto& f = figures().joint[j];
    const S& angle = angle_.values[j];
    const S& speed = speed_.values[j];
    S wanted = control::pd_torque(f.stiffness, f.damping, target_.angle.values[j], angle, speed);
    // Clear of its limits a joint's torque does not fade: both fades are 1.
    const S room = min(f.angle_max - angle, angle - f.angle_min);
    const S spare = f.speed_max - abs(speed);
    const auto clear = (room >= S(f.soft_edge)) & (spare >= S(f.speed_max - f.soft_speed));
    if (any(!clear)) {
      wanted = safety::edge_fade(wanted, angle, S(f.angle_min), S(f.angle_max), S(f.soft_edge));
      wanted = safety::speed_fade(wanted, speed, S(f.soft_speed), S(f.speed_max));
    }
    const S torque = safety::slew_clamp(safety::peak_clamp(wanted, S(f.peak)), torque_.values[j], S(f.step));
    torque_.values[j] = torque;
    const stub::Seen<S> seen = slow_bus_ ? stub::Seen<S>{seen_angle_[j], seen_speed_[j]} : encoder(j);
    row[j] = stub::folded(hold_of(f), torque, seen);
  }
}

/// Which command the drives act on now, and whether it lets them.
template <class S>
void LaneWalker<S>::hear() {
  if (jitters_) {
    jitter();
  } else {
    acting_ = W(now_) - command_delay_;
  }
  command_at_ = place_in_ring(acting_, command_rows_, joints());
  if (!stands_up_ || jitters_) return;
  told_.on = not_negative<T>(acting_ - torque_from_);
}

/// Commands that are late by chance; drives that have heard nothing for too long.
template <class S>
void LaneWalker<S>::jitter() {
  for (int lane = 0; lane < kLanes; ++lane) {
    const auto n = static_cast<std::size_t>(lane);
    const OnMark& mark = mark_[n];
    const std::uint32_t late = mark.command_jitter_s > 0
                                   ? jittered_delay(*settings_, mark, now_ - placed_[lane])
                                   : mark.command_delay;
    const std::uint32_t newest = now_ - late;
    if (newest > acting_[lane]) {
      acting_.put(lane, newest);
      arrived_[n] = now_;
    }
    const bool on = acting_[lane] >= torque_from_[lane];
    const bool answered = on && acting_[lane] >= placed_[lane];
    const std::uint32_t silent = answered ? now_ - arrived_[n] : 0;
    if (silent > settings_->let_go_ticks) let_go_[n] = true;
    const bool damps = !let_go_[n] && silent > settings_->timeout_ticks;
    told_.damping.put(lane, damps ? T(1) : T(0));
    told_.on.put(lane, on && !damps && !let_go_[n] ? T(1) : T(0));
  }
}

/// What the drives make of the command that has arrived.
template <class S>
void LaneWalker<S>::correct() {
  const T* from = reinterpret_cast<const T*>(commands_.data());
  for (std::size_t j = 0; j < joints(); ++j) {
    const S command = gathered(from + j * kLanes, command_at_);
    told_.wanted[j] = stub::unfolded(hold_of(figures().joint[j]), command, encoder(j));
  }
}

template <class S>
void LaneWalker<S>::push() {
  const auto acts = (ticks_ >= own_.push_first) & (ticks_ < own_.push_end);
  const S zero(T(0));
  site_.around.push = {select(acts, own_.push.x, zero), select(acts, own_.push.y, zero),
                       select(acts, own_.push.z, zero)};
}

template <class S>
unsigned LaneWalker<S>::score() {
  const auto& figs = figures();
  const auto& body = robot_.body;
  const S dx = body.position.x - own_.x;
  const S dy = body.position.y - own_.y;
  const S y = own_.cosine * dy - own_.sine * dx;
  distance_ = own_.cosine * dx + own_.sine * dy;
  const S speed = own_.cosine * body.velocity.x + own_.sine * body.velocity.y;
  episode::add(sums_, episode::TickScore<S>{speed, power_, y, body_.yaw_rad}, settings_->weights,
               settings_->period_s);
  fell_ = bits_of(stub::fallen(figs.robot.tree, site_.around.ground, figs.stance_height, body));
  unsigned over = 0;
  if (!stands_up_) over = (fell_ | bits_of(!(abs(y) <= S(figs.lane_half_width)))) & busy_;
  if (now_ == next_end_) {
    for (int lane = 0; lane < kLanes; ++lane) {
      if (end_[static_cast<std::size_t>(lane)] == now_) over |= 1U << static_cast<unsigned>(lane);
    }
  }
  return over;
}

}  // namespace pastern::packed::PASTERN_LANES_SET
