// The tick of a walk strung together from the same parts as the robot's.
#include "tools/train/walk.h"

#include <cmath>
#include <numbers>
#include <string>
#include <vector>

#include "runtime/control/pd.h"
#include "runtime/episode/recorder.h"
#include "runtime/policy/policy_parts.h"
#include "runtime/session/blend.h"
#include "safety/clamps.h"
#include "tools/train/draws.h"
#include "tools/train/sites.h"

namespace pastern::tools {
namespace {

// The gate's pure clamps of one joint (safety/clamps.h), which a walk within its limits meets.
struct Clamps {
  double peak, step, angle_min, angle_max, soft_edge, soft_speed, speed_max;
};

Clamps clamps_of(const v1::Joint& joint, double period_s) {
  const v1::JointGuard& guard = joint.guard();
  return {guard.peak_torque_nm(),     guard.slew_nm_per_s() * period_s,
          joint.angle_min_rad(),      joint.angle_max_rad(),
          guard.soft_edge_rad(),      guard.soft_speed_rad_per_s(),
          guard.speed_max_rad_per_s()};
}

double clamped(const Clamps& c, double wanted, double angle, double speed, double before) {
  const double inside = safety::edge_fade(wanted, angle, c.angle_min, c.angle_max, c.soft_edge);
  const double faded = safety::speed_fade(inside, speed, c.soft_speed, c.speed_max);
  return safety::slew_clamp(safety::peak_clamp(faded, c.peak), before, c.step);
}

}  // namespace

struct WalkSetting::Parts {
  std::shared_ptr<const stub::Model> model;
  std::shared_ptr<const packed::WalkSettings> for_lanes;
  policy::Shape<double> shape;
  control::Gains<double> gains;
  episode::Weights weights;
  std::vector<Clamps> clamps;
  JointAngles<> stance;
  double lane_half_width_m{0};
  double period_s{0};
  int parked_ticks{0};  // before the walk, as in a session: on the mark, then up, then standing
  int rise_ticks{0};
  int stand_ticks{0};
  int ticks{0};           // of a walk
  int ticks_per_step{0};  // of the policy
};

WalkSetting::WalkSetting() : parts_(std::make_unique<Parts>()) {}
WalkSetting::~WalkSetting() = default;
const stub::Model& WalkSetting::model() const { return *parts_->model; }
const std::shared_ptr<const packed::WalkSettings>& WalkSetting::for_lanes() const {
  return parts_->for_lanes;
}

std::shared_ptr<const WalkSetting> WalkSetting::make(const v1::Robot& robot, const v1::Policy& policy,
                                                     double walk_s, std::string& error,
                                                     double longest_step_s) {
  const std::shared_ptr<WalkSetting> setting(new WalkSetting);
  Parts& parts = *setting->parts_;
  parts.for_lanes = packed::walk_settings(robot, policy, walk_s, error, longest_step_s);
  if (!parts.for_lanes) return nullptr;
  parts.model = parts.for_lanes->model;
  parts.shape = policy::shape_of<double>(policy, robot);
  parts.gains = control::gains_of(robot);
  parts.weights = episode::weights_of(robot);
  parts.period_s = 1 / robot.cycle_hz();
  parts.lane_half_width_m = robot.lane().half_width_m();
  for (int j = 0; j < robot.joints_size(); ++j) {
    parts.clamps.push_back(clamps_of(robot.joints(j), parts.period_s));
    parts.stance[j] = robot.joints(j).stance_rad();
  }
  const auto ticks = [&robot](double s) { return static_cast<int>(std::lround(s * robot.cycle_hz())); };
  parts.parked_ticks = ticks(session::kOnTheMark_s);
  parts.rise_ticks = ticks(robot.rise_s());
  parts.stand_ticks = ticks(session::kStand_s);
  parts.ticks = ticks(walk_s);
  parts.ticks_per_step = static_cast<int>(std::lround(robot.cycle_hz() / policy.rate_hz()));
  return setting;
}

struct WalkCourse::Work {
  explicit Work(const WalkSetting& setting)
      : robot(setting.parts_->model, stub::nominal_site(setting.model()), 0),
        scratch(policy::scratch_of(setting.parts_->shape)) {}

  stub::SimulatedRobot robot;
  policy::Scratch<double> scratch;
  safety::SensorFrame frame;
  BodyEstimate<> body;
  JointTarget<> target;
  safety::Torques<> torque;
  // How the last lot's robot stood before its walk: the next trial may be of the same lot.
  struct {
    bool known{false};
    Lot lot;
    std::string robot;
    safety::SensorFrame frame;
    safety::Torques<> torque;
  } stood;
  double roll_error{0};
  double pitch_error{0};
  // Yaw, place and speed count from the start's own place and heading, as the estimator's do.
  double cosine{1};
  double sine{0};
  double yaw{0};
  double x{0};
  double y{0};
};

WalkCourse::WalkCourse(std::shared_ptr<const WalkSetting> setting, SiteChoice choose)
    : setting_(std::move(setting)), choose_(std::move(choose)), work_(std::make_unique<Work>(*setting_)) {}
WalkCourse::~WalkCourse() = default;
std::unique_ptr<Course> WalkCourse::another() const {
  return std::make_unique<WalkCourse>(setting_, choose_);
}
double WalkCourse::duration_s() const { return setting_->parts_->ticks * setting_->parts_->period_s; }

namespace {

// The trunk as the estimator would tell it, in axes of the start.
template <class Work>
void place_of(Work& work) {
  const auto& body = work.robot.state().body;
  const double dx = body.position.x - work.x;
  const double dy = body.position.y - work.y;
  work.body.position.x = work.cosine * dx + work.sine * dy;
  work.body.position.y = work.cosine * dy - work.sine * dx;
  work.body.velocity.x = work.cosine * body.velocity.x + work.sine * body.velocity.y;
  work.body.velocity.y = work.cosine * body.velocity.y - work.sine * body.velocity.x;
}

template <class Work>
void attitude_of(Work& work) {
  const stub::Truth truth = work.robot.truth();
  work.body.roll_rad = truth.roll_rad + work.roll_error;
  work.body.pitch_rad = truth.pitch_rad + work.pitch_error;
  work.body.yaw_rad = std::remainder(truth.yaw_rad - work.yaw, 2 * std::numbers::pi);
  work.body.rate = work.frame.rate;
}

// A lost frame leaves the last one standing.
template <class Work>
void read(Work& work) {
  static_cast<void>(work.robot.read(work.frame));
}

template <class Parts, class Work>
void drive(const Parts& parts, Work& work) {
  const auto wanted = control::pd_torques(parts.gains, work.target, work.frame.angle, work.frame.speed);
  for (int j = 0; j < parts.gains.joint_count; ++j) {
    work.torque[j] = clamped(parts.clamps[static_cast<std::size_t>(j)], wanted[j], work.frame.angle[j],
                             work.frame.speed[j], work.torque[j]);
  }
  work.robot.command(work.torque, true);
  work.robot.step();
}

template <class Parts, class Work>
void rise(const Parts& parts, Work& work) {
  for (int tick = 0; tick < parts.parked_ticks; ++tick) {
    read(work);
    work.robot.command({}, false);
    work.robot.step();
  }
  JointAngles<> from;
  for (int tick = 0; tick < parts.rise_ticks; ++tick) {
    read(work);
    if (tick == 0) from = work.frame.angle;
    const double share = session::smooth_share(static_cast<double>(tick + 1) / parts.rise_ticks);
    work.target.angle = session::between(from, parts.stance, share, parts.gains.joint_count);
    drive(parts, work);
  }
}

template <class Parts, class Work>
void stand(const Parts& parts, Work& work) {
  work.target.angle = parts.stance;
  for (int tick = 0; tick < parts.stand_ticks; ++tick) {
    read(work);
    drive(parts, work);
  }
}

// As a session brings its robot to a walk. How the feet grip and how the trunk sags after a rise is felt all
// through the walk: a robot put down in its stance drifts less. One that does not get up by itself is put on
// its feet.
template <class Parts, class Work>
void come_to_stand(const Parts& parts, Work& work, std::uint64_t draw) {
  work.robot.place_lying(draw);
  work.torque = {};
  work.frame = {};
  rise(parts, work);
  stand(parts, work);
  if (!work.robot.fallen()) return;
  work.robot.place_standing(draw);
  work.torque = {};
  stand(parts, work);
}

template <class Parts, class Work>
void begin(const Parts& parts, Work& work, const SiteChoice& choose, const Lot& lot) {
  const WalkChance chance = chance_of(lot);
  work.roll_error = chance.roll_error_rad;
  work.pitch_error = chance.pitch_error_rad;
  work.robot.renew(choose(*parts.model, lot), chance.seed);
  std::string error;
  auto& stood = work.stood;
  const bool again = stood.known && stood.lot.seed == lot.seed && stood.lot.number == lot.number;
  if (again && work.robot.restore(stood.robot, error)) {
    work.frame = stood.frame;
    work.torque = stood.torque;
  } else {
    come_to_stand(parts, work, chance.draw);
    stood = {true, lot, work.robot.save(), work.frame, work.torque};
  }
  const stub::Truth truth = work.robot.truth();
  work.yaw = truth.yaw_rad;
  work.cosine = std::cos(truth.yaw_rad);
  work.sine = std::sin(truth.yaw_rad);
  work.x = truth.position_m[0];
  work.y = truth.position_m[1];
}

}  // namespace

Score WalkCourse::run(const Parameters& parameters, const Lot& lot) {
  const WalkSetting::Parts& parts = *setting_->parts_;
  Work& work = *work_;
  begin(parts, work, choose_, lot);
  if (watch_) watch_(work.robot, 0);
  episode::ReturnSums<double> sums;
  Score score;
  for (int tick = 0; tick < parts.ticks; ++tick) {
    read(work);
    if (tick % parts.ticks_per_step == 0) {
      attitude_of(work);
      const double phase = tick * parts.period_s * parts.shape.gait_hz;
      work.target =
          policy::evaluate(parts.shape, parameters.data(), work.scratch, work.body, work.frame.angle,
                           work.frame.speed, policy::gait_phase(phase - std::floor(phase)));
    }
    drive(parts, work);
    if (watch_) watch_(work.robot, (tick + 1) * parts.period_s);
    place_of(work);
    const double power = episode::joint_power(work.frame.torque, work.frame.speed, parts.gains.joint_count);
    episode::add(sums, {work.body.velocity.x, power, work.body.position.y, work.body.yaw_rad}, parts.weights,
                 parts.period_s);
    score.fell = work.robot.fallen();
    if (score.fell || !(std::abs(work.body.position.y) <= parts.lane_half_width_m)) break;
  }
  score.terms = episode::terms(sums, parts.weights, score.fell);
  score.distance_m = work.body.position.x;
  return score;
}

WalkChance chance_of(const Lot& lot) noexcept {
  // What the estimator on the robot is off by, for as long as a walk lasts: a tilted IMU and a gyro that is
  // still settling.
  constexpr double kAttitudeError_rad = 0.006;
  Draws draws(lot.seed, Purpose::walk, lot.number);
  WalkChance chance;
  chance.seed = draws.word64();
  chance.draw = draws.word64();
  chance.roll_error_rad = kAttitudeError_rad * draws.normal();
  chance.pitch_error_rad = kAttitudeError_rad * draws.normal();
  return chance;
}

SiteChoice drawn_sites(const SiteRanges& ranges) {
  return [ranges](const stub::Model& model, const Lot& lot) {
    return draw_site(model, ranges, lot.seed, lot.number);
  };
}

SiteChoice one_site(const stub::Site& site) {
  return [site](const stub::Model&, const Lot&) { return site; };
}

}  // namespace pastern::tools
