// The tick and the motions. What a tick needs is allocated when the cycle is made.
#include "runtime/session/cycle.h"

#include <time.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "runtime/control/pd.h"
#include "runtime/episode/recorder.h"
#include "runtime/estimate/estimator.h"
#include "runtime/policy/policy.h"
#include "runtime/session/blend.h"

namespace pastern::session {
namespace {

safety::TimeNs monotonic_now() noexcept {
  timespec now{};
  clock_gettime(CLOCK_MONOTONIC, &now);
  return {static_cast<std::int64_t>(now.tv_sec) * 1'000'000'000 + now.tv_nsec};
}

JointAngles<> pose_of(const v1::Robot& robot, double (v1::Joint::*angle)() const) {
  JointAngles<> pose;
  for (int j = 0; j < robot.joints_size(); ++j) pose[j] = (robot.joints(j).*angle)();
  return pose;
}

}  // namespace

bool caused_by_walking(safety::Cause cause) noexcept {
  switch (cause) {
    case safety::Cause::roll:
    case safety::Cause::pitch:
    case safety::Cause::body_rate:
    case safety::Cause::base_low:
    case safety::Cause::measured_torque:
    case safety::Cause::joint_position:
    case safety::Cause::joint_speed:
      return true;
    default:
      return false;
  }
}

struct Cycle::Impl {
  Impl(const v1::Robot& checked, const v1::Policy& file, std::unique_ptr<hal::Drives> owned, Pace its_pace)
      : robot(checked),
        limits(limits_of(checked)),
        pace(its_pace),
        drives(std::move(owned)),
        gate(limits),
        estimator(checked),
        recorder(checked),
        gains(control::gains_of(checked)),
        fall_rule(episode::fall_rule_of(checked)),
        stance(pose_of(checked, &v1::Joint::stance_rad)),
        lying(pose_of(checked, &v1::Joint::lying_rad)),
        joint_count(checked.joints_size()),
        period_s(1.0 / checked.cycle_hz()),
        period_ns(std::llround(1e9 / checked.cycle_hz())) {
    take_policy(file);
    target.angle = lying;
  }

  void take_policy(const v1::Policy& file) {
    policy = policy::Policy::make(file, robot);
    policy_period_s = 1.0 / file.rate_hz();
    policy_every = std::max<std::int64_t>(1, std::llround(robot.cycle_hz() / file.rate_hz()));
  }

  // Steps of a tick, in order.
  [[nodiscard]] bool read() noexcept;
  [[nodiscard]] bool timely() const noexcept;
  void estimate(bool fresh) noexcept;
  void steer() noexcept;
  [[nodiscard]] safety::Flags flags(bool fresh) const noexcept;
  void score(bool clamped) noexcept;
  void advance() noexcept;

  void enter(Motion next, double duration_s) noexcept;
  void finish(bool completed) noexcept;
  [[nodiscard]] std::int64_t ticks_of(double duration_s) const noexcept {
    return std::max<std::int64_t>(1, std::llround(duration_s / period_s));
  }
  [[nodiscard]] bool armed() const noexcept { return gate.phase() == safety::Phase::armed; }

  const v1::Robot robot;
  const safety::Limits limits;
  const Pace pace;
  std::unique_ptr<hal::Drives> drives;
  safety::Gate gate;
  estimate::Estimator estimator;
  std::unique_ptr<policy::Policy> policy;
  episode::EpisodeRecorder recorder;
  const control::Gains<> gains;
  const episode::FallRule fall_rule;
  const JointAngles<> stance;
  const JointAngles<> lying;
  const int joint_count;
  const double period_s;
  const std::int64_t period_ns;
  double policy_period_s{0.02};
  std::int64_t policy_every{20};
  Signals signals;

  // State of the tick.
  safety::SensorFrame frame;
  JointTarget<> target;
  safety::TimeNs now;
  bool bus_error{false};
  bool write_failed{false};
  bool seen_frame{false};
  bool cold{true};  // the estimator takes roll and pitch from gravity with the next fresh frame
  bool walk_begins{false};
  double winding_max_c{0};
  std::uint64_t ticks{0};
  std::uint64_t gate_tick_base{0};  // ticks carried over from before this process; the gate counts its own
  std::uint64_t missed{0};
  std::uint64_t overruns{0};

  // State of the motion.
  Motion motion{Motion::parked};
  Motion asked{Motion::parked};
  std::int64_t length{1};
  std::int64_t elapsed{0};
  JointAngles<> from;
  bool from_taken{true};
  bool fades_gait{false};  // settling out of a walk: the policy goes on, its share falls to nothing
  bool done{true};
  bool completed{true};
  bool tripped{false};
  safety::Trip trip;  // as at the end of the motion; the gate's own may change while the result is read
  bool scoring{false};
  bool fall_seen{false};  // by the estimate; asks the gate for a stop
  bool fall_estimated{false};
  BodyEstimate<> fall_body;
  int clipped{0};  // of this tick's policy step
  Outcome outcome{Outcome::completed};
};

bool Cycle::Impl::read() noexcept {
  const hal::ReadResult result = drives->read(frame);
  bus_error = result == hal::ReadResult::failed || write_failed;
  const bool fresh = result == hal::ReadResult::fresh;
  if (fresh) {
    seen_frame = true;
    winding_max_c = frame.winding[0];
    for (int j = 1; j < joint_count; ++j) winding_max_c = std::max(winding_max_c, frame.winding[j]);
  }
  return fresh;
}

// A plug-in whose frames queue up gives new ones without an end, each of them old. When torque is wanted such
// a frame is no new one to the gate, whose stale watch finds it. As doubles: any number may stand in the
// frame.
bool Cycle::Impl::timely() const noexcept {
  if (pace == Pace::stepped || motion == Motion::parked) return true;
  const double age_s = (static_cast<double>(now.value) - static_cast<double>(frame.time.value)) * 1e-9;
  return std::fabs(age_s) <= limits.frame_stale_s;
}

void Cycle::Impl::estimate(bool fresh) noexcept {
  if (!fresh) return;
  if (cold || walk_begins) estimator.begin(frame, cold);
  cold = false;
  walk_begins = false;
  estimator.update(frame, period_s);
}

void Cycle::Impl::steer() noexcept {
  clipped = 0;
  if (!from_taken) {  // a motion that starts from where the robot is found
    from = frame.angle;
    from_taken = true;
  }
  const double share = smooth_share(static_cast<double>(elapsed + 1) / static_cast<double>(length));
  switch (motion) {
    case Motion::parked:
      target.angle = frame.angle;
      break;
    case Motion::rise:
      target.angle = between(from, stance, share, joint_count);
      break;
    case Motion::settle:
      // Feet that stand still at once would throw the trunk over them: the gait goes on and fades.
      if (fades_gait && elapsed % policy_every == 0) {
        from = policy->step(estimator.body(), frame.angle, frame.speed, policy_period_s).angle;
      }
      target.angle = between(from, stance, share, joint_count);
      break;
    case Motion::lower:
      target.angle = between(from, lying, share, joint_count);
      break;
    case Motion::stand:
      target.angle = stance;
      break;
    case Motion::walk:
      if (elapsed % policy_every == 0) {
        target = policy->step(estimator.body(), frame.angle, frame.speed, policy_period_s);
        clipped = target.clipped;
      }
      break;
  }
}

safety::Flags Cycle::Impl::flags(bool fresh) const noexcept {
  safety::Flags set;
  set.stop = signals.stop.load(std::memory_order_acquire);
  set.halt = signals.halt.load(std::memory_order_acquire);
  set.baton_lost = pace == Pace::wall && signals.baton_lost.load(std::memory_order_acquire);
  set.internal_stop = fall_seen || signals.internal_stop.load(std::memory_order_acquire);
  set.bus_error = bus_error;
  set.frame_new = fresh;
  set.watch_base = motion == Motion::stand || motion == Motion::walk || motion == Motion::settle;
  set.torque_wanted = motion != Motion::parked;
  return set;
}

// A fall ends the score at once; what follows is the stop sequence.
void Cycle::Impl::score(bool clamped) noexcept {
  if (!scoring) return;
  const BodyEstimate<>& body = estimator.body();
  if (!armed()) {
    scoring = false;
    outcome = caused_by_walking(gate.trip().cause) ? Outcome::fell : Outcome::voided;
    return;
  }
  if (episode::fell(fall_rule, body)) {
    scoring = false;
    fall_seen = true;
    fall_estimated = true;
    fall_body = body;
    outcome = Outcome::fell;
    return;
  }
  episode::TickRecord record;
  record.body = body;
  record.power_w = episode::joint_power(frame.torque, frame.speed, joint_count);
  record.pack_power_w = frame.pack_voltage_v * frame.pack_current_a;
  record.pack_voltage_v = frame.pack_voltage_v;
  record.winding_max_c = winding_max_c;
  record.clamped = clamped;
  record.targets_clipped = clipped;
  recorder.add(record, frame.angle, period_s);
  if (episode::left_lane(fall_rule, body)) outcome = Outcome::left_lane;
}

void Cycle::Impl::advance() noexcept {
  ++ticks;
  ++elapsed;
  if (!armed()) fall_seen = false;
  if (motion == Motion::parked) {
    if (elapsed >= length) finish(armed());
  } else if (gate.phase() == safety::Phase::off) {
    finish(false);
  } else if (armed() && !fall_seen) {
    if (elapsed >= length || outcome == Outcome::left_lane) finish(true);
  }
}

// Nobody may have asked for the next motion yet: the robot must be safe meanwhile.
void Cycle::Impl::finish(bool whole) noexcept {
  if (!done) {
    done = true;
    completed = whole;
    tripped = !armed();
    trip = gate.trip();
    trip.tick += gate_tick_base;
    scoring = false;
  }
  if (!armed() || motion == Motion::lower || motion == Motion::parked) {
    enter(Motion::parked, 0);
  } else if (motion == Motion::walk) {
    enter(Motion::settle, 0);
  } else {
    enter(Motion::stand, 0);
  }
}

void Cycle::Impl::enter(Motion next, double duration_s) noexcept {
  fades_gait = next == Motion::settle && motion == Motion::walk;
  motion = next;
  elapsed = 0;
  from_taken = next != Motion::rise;
  from = target.angle;
  switch (next) {
    case Motion::rise:
    case Motion::lower:
      length = ticks_of(robot.rise_s());
      break;
    case Motion::settle:
      length = ticks_of(robot.settle_s());
      break;
    default:
      length = ticks_of(duration_s);
      break;
  }
}

Cycle::Cycle(const v1::Robot& robot, const v1::Policy& policy, std::unique_ptr<hal::Drives> drives, Pace pace)
    : impl_(std::make_unique<Impl>(robot, policy, std::move(drives), pace)) {}

Cycle::~Cycle() = default;

Signals& Cycle::signals() noexcept { return impl_->signals; }
hal::Drives& Cycle::drives() noexcept { return *impl_->drives; }
safety::Gate& Cycle::gate() noexcept { return impl_->gate; }
double Cycle::period_s() const noexcept { return impl_->period_s; }

void Cycle::load(const Parameters& parameters) noexcept { impl_->policy->load(parameters); }
void Cycle::change_policy(const v1::Policy& policy) { impl_->take_policy(policy); }

void Cycle::begin(Motion motion, double duration_s) noexcept {
  Impl& s = *impl_;
  s.asked = motion;
  s.done = false;
  s.completed = false;
  s.tripped = false;
  s.fall_seen = false;
  s.fall_estimated = false;
  s.scoring = false;
  s.outcome = Outcome::completed;
  if (motion != Motion::parked && !s.armed()) {
    s.finish(false);
    return;
  }
  const bool goes_on = motion == Motion::settle && s.fades_gait;  // it began when the walk ended
  if (!goes_on) s.enter(motion, duration_s);
  if (motion == Motion::rise) s.cold = true;
  if (motion == Motion::walk) {
    s.walk_begins = true;
    s.policy->reset();
    s.recorder.begin();
    s.scoring = true;
  }
}

void Cycle::tick(safety::TimeNs due) noexcept {
  Impl& s = *impl_;
  double late_s = 0;
  if (s.pace == Pace::wall) {
    s.now = monotonic_now();
    late_s = static_cast<double>(s.now.value - due.value) * 1e-9;
  } else {
    s.now.value += s.period_ns;
  }
  const bool fresh = s.read();
  s.estimate(fresh);
  s.steer();
  const Torques<> wanted = control::pd_torques(s.gains, s.target, s.frame.angle, s.frame.speed);
  const safety::DriveCommand command =
      s.gate.judge(s.frame, wanted, s.target.angle, s.flags(fresh && s.timely()), s.now, late_s);
  s.write_failed = !s.drives->write(command);
  if (!s.armed() || !command.torque_on()) s.signals.stopped_commands.fetch_add(1, std::memory_order_release);
  if (!(late_s <= s.limits.overrun_s)) ++s.overruns;
  s.score(s.gate.clamped());
  s.advance();
}

bool Cycle::done() const noexcept { return impl_->done; }

MotionResult Cycle::result() const {
  const Impl& s = *impl_;
  MotionResult result;
  result.completed = s.completed;
  result.tripped = s.tripped;
  result.trip = s.trip;
  result.outcome = s.outcome;
  if (s.asked != Motion::walk) return result;
  result.fall_estimated = s.fall_estimated;
  result.fall_body = s.fall_body;
  result.terms = s.recorder.terms(s.outcome == Outcome::fell);
  result.summary = s.recorder.summary();
  result.trace = s.recorder.trace();
  return result;
}

MotionResult Cycle::run(Motion motion, double duration_s) {
  begin(motion, duration_s);
  while (!done()) tick(impl_->now);
  return result();
}

void Cycle::set_down() noexcept {
  impl_->gate.reset_filters();
  impl_->cold = true;
}

void Cycle::count_missed(std::uint64_t ticks) noexcept { impl_->missed += ticks; }

Motion Cycle::motion() const noexcept { return impl_->motion; }

safety::TimeNs Cycle::now() const noexcept { return impl_->now; }

CycleReport Cycle::report() const noexcept {
  const Impl& s = *impl_;
  CycleReport report;
  report.ticks = s.ticks;
  report.missed = s.missed;
  report.overruns = s.overruns;
  report.now = s.now;
  report.motion = s.motion;
  report.done = s.done;
  report.phase = s.gate.phase();
  report.hold = s.gate.hold();
  report.trip = s.gate.trip();
  report.trip.tick += s.gate_tick_base;
  report.pack_voltage_v = s.frame.pack_voltage_v;
  report.pack_current_a = s.frame.pack_current_a;
  report.winding_max_c = s.winding_max_c;
  report.joint_count = s.seen_frame ? s.joint_count : 0;
  report.angle = s.frame.angle;
  report.winding = s.frame.winding;
  report.targeted = s.armed() && s.motion != Motion::parked;
  report.target = s.target.angle;
  report.thermal = s.gate.thermal_state();
  return report;
}

v1::CarriedState Cycle::save() {
  Impl& s = *impl_;
  v1::CarriedState state;
  state.set_ticks(s.ticks);
  state.set_time_ns(s.now.value);
  for (int j = 0; j < s.joint_count; ++j) state.add_thermal(s.gate.thermal_state()[j]);
  std::string own;
  if (s.drives->simulated() && s.drives->save(own)) state.set_simulated_robot(own);
  return state;
}

bool Cycle::restore(const v1::CarriedState& state, bool clock) {
  Impl& s = *impl_;
  safety::PerJoint<safety::Celsius> thermal;
  // A joint that the state does not know is not assumed cold: the gate takes what is not a number as hot.
  for (int j = 0; j < s.joint_count; ++j) {
    thermal[j] = j < state.thermal_size() ? state.thermal(j) : std::numeric_limits<double>::quiet_NaN();
  }
  s.gate.restore_thermal_state(thermal);
  if (!clock) return true;
  s.gate_tick_base = state.ticks() - (s.ticks - s.gate_tick_base);
  s.ticks = state.ticks();
  s.now.value = state.time_ns();
  return state.simulated_robot().empty() || s.drives->restore(state.simulated_robot());
}

}  // namespace pastern::session
