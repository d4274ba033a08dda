// Whole walks by lanes; compiled once for each set of instructions.
#include "tools/packed/walk_tick.h"

namespace pastern::packed::PASTERN_LANES_SET {
namespace {

template <class F>
void for_lanes(unsigned lanes, F f) {
  for (; lanes != 0; lanes &= lanes - 1) f(std::countr_zero(lanes));
}

}  // namespace

template <class S>
LaneWalker<S>::LaneWalker(std::shared_ptr<const WalkSettings> settings)
    : settings_(std::move(settings)),
      parked_(on_mark(*settings_, stub::nominal_site(*settings_->model), 0, 0)),
      shape_(policy::shape_as<S>(settings_->shape)),
      scratch_(policy::scratch_of(shape_)),
      parameters_(settings_->shape.parameter_count, S(T(0))) {
  plane_legs_ = has_plane_legs(figures().robot.tree);
  put_on_feet(*settings_, stub::nominal_site(*settings_->model), parked_);
}

template <class S>
void LaneWalker<S>::begin() {
  now_ = 4096 * settings_->ticks_per_step;  // nothing reaches back before tick 0
  more_ = true;
  busy_ = 0;
  end_.fill(kNever);
  next_end_ = kNever;
  site_ = {};
  for (int lane = 0; lane < kLanes; ++lane) park(lane);
}

template <class S>
void LaneWalker<S>::stand_up(StandDesk& desk) {
  stands_up_ = true;
  for (begin(), refill(desk); busy_ != 0;) {
    const unsigned over = tick();
    if (over == 0) continue;
    finish(desk, over);
    refill(desk);
  }
}

template <class S>
void LaneWalker<S>::walk(WalkDesk& desk) {
  stands_up_ = false;
  begin();
  do {
    refill(desk);
    for (std::uint32_t n = 0; busy_ != 0 && n < settings_->ticks_per_step; ++n) {
      const unsigned over = tick();
      if (over != 0) finish(desk, over);
    }
  } while (busy_ != 0 || more_);
}

template <class S>
void LaneWalker<S>::refill(WalkDesk& desk) {
  for_lanes(kAll & ~busy_, [&](int lane) {
    WalkTask task;
    std::size_t& id = id_[static_cast<std::size_t>(lane)];
    if (more_) more_ = desk.next(task, id);
    if (!more_) return park(lane);
    put(lane, *task.stood);
    for (std::size_t p = 0; p < parameters_.size(); ++p) {
      parameters_[p].put(lane, static_cast<T>(task.parameters[p]));
    }
    set_end(lane, now_ + settings_->ticks);
  });
}

template <class S>
void LaneWalker<S>::refill(StandDesk& desk) {
  for_lanes(kAll & ~busy_, [&](int lane) {
    OnMark robot;
    if (more_) more_ = desk.next(robot, id_[static_cast<std::size_t>(lane)]);
    if (!more_) return park(lane);
    put(lane, robot);
    set_end(lane, now_ + settings_->parked_ticks + settings_->rise_ticks + settings_->stand_ticks);
  });
}

template <class S>
void LaneWalker<S>::finish(WalkDesk& desk, unsigned over) {
  for_lanes(over, [&](int lane) {
    const auto n = static_cast<std::size_t>(lane);
    WalkEnd end;
    end.sums = {sums_.forward[lane], sums_.energy_j[lane], sums_.drift[lane], sums_.turn[lane]};
    end.fell = ((fell_ >> n) & 1U) != 0;
    end.distance_m = distance_[lane];
    end.ticks = now_ - walk_from_[n];
    set_end(lane, kNever);
    desk.done(id_[n], end);
  });
}

/// One that does not get up by itself is put on its feet.
template <class S>
void LaneWalker<S>::finish(StandDesk& desk, unsigned over) {
  for_lanes(over, [&](int lane) {
    const auto n = static_cast<std::size_t>(lane);
    const bool lies = ((fell_ >> n) & 1U) != 0;
    set_end(lane, kNever);
    if (lies && mark_[n].lying) {
      OnMark robot = mark_[n];
      for (std::size_t j = 0; j < joints(); ++j) {
        robot.state.drives.winding[j] = robot_.drives.winding[j][lane];
        robot.state.drives.housing[j] = robot_.drives.housing[j][lane];
      }
      robot.state.pack = {robot_.pack.charge[lane], robot_.pack.voltage[lane], robot_.pack.current[lane],
                          robot_.pack.share[lane]};
      desk.again(id_[n], robot);
      put(lane, robot);
      return set_end(lane, now_ + settings_->stand_ticks);
    }
    Stood stood;
    keep(lane, stood);
    desk.done(id_[n], std::move(stood));
  });
}

template <class S>
void LaneWalker<S>::set_end(int lane, std::uint32_t end) {
  const auto n = static_cast<std::size_t>(lane);
  end_[n] = end;
  busy_ = end == kNever ? busy_ & ~(1U << n) : busy_ | (1U << n);
  next_end_ = *std::min_element(end_.begin(), end_.end());
}

template <class S>
void LaneWalker<S>::park(int lane) {
  put(lane, parked_);
  for (S& parameter : parameters_) parameter.put(lane, T(0));
}

// ---- Into a lane and out of it ----

template <class S>
void LaneWalker<S>::put_site(int lane, const OnMark& robot) {
  const auto n = static_cast<std::size_t>(lane);
  if (&robot != &mark_[n]) mark_[n] = robot;
  PASTERN_LANES_SET::put(lane, joints(), robot.site, site_);
  PASTERN_LANES_SET::put(lane, joints(), robot, own_);
  chance_.put(lane, robot.seed, robot.draw);
  command_delay_.put(lane, robot.command_delay);
  sample_delay_.put(lane, robot.sensor_delay);
  imu_delay_.put(lane, robot.imu_delay);
  jitters_ =
      std::any_of(mark_.begin(), mark_.end(), [](const auto& one) { return one.command_jitter_s > 0; });
  slow_bus_ = std::any_of(mark_.begin(), mark_.end(), [](const auto& one) { return one.oldest_sample > 0; });
  flawed_ = std::any_of(mark_.begin(), mark_.end(), [](const auto& one) { return one.flaws.any(); });
  make_room(robot);
  for (std::size_t j = 0; j < joints(); ++j) told_.forced[j].put(lane, T(0));
  told_.damping.put(lane, T(0));
  told_.on.put(lane, T(1));
  for (S* sum : {&sums_.forward, &sums_.energy_j, &sums_.drift, &sums_.turn}) sum->put(lane, T(0));
  walk_from_[n] = now_;
}

template <class S>
void LaneWalker<S>::put(int lane, const OnMark& robot) {
  const auto n = static_cast<std::size_t>(lane);
  put_site(lane, robot);
  std::vector<double> numbers;
  stub::RobotState<double> state = robot.state;
  each_number(figures().robot.tree, state, [&](double& number) { numbers.push_back(number); });
  const double* next = numbers.data();
  each_number(figures().robot.tree, robot_, [&](S& number) { number.put(lane, static_cast<T>(*next++)); });
  placed_.put(lane, now_);
  ticks_.put(lane, T(0));
  acting_.put(lane, now_ - robot.longest_delay - 1);
  arrived_[n] = now_;
  let_go_[n] = false;
  // Lying: no torque until the rise begins. Standing: until the first command comes the drives hold the
  // stance, which is a command like any other.
  torque_from_.put(lane, robot.lying ? now_ + settings_->parked_ticks : 0);
  rise_clock_.put(
      lane, robot.lying ? -static_cast<T>(settings_->parked_ticks) : static_cast<T>(settings_->rise_ticks));
  for (std::size_t j = 0; j < joints(); ++j) {
    const auto& joint = figures().joint[j];
    torque_.values[j].put(lane, T(0));
    target_.angle.values[j].put(lane, joint.stance);
    for (std::uint32_t back = 1; back <= robot.longest_delay + 1; ++back) {
      const std::size_t row = (now_ - back) & (command_rows_ - 1);
      commands_[row * joints() + j].put(lane, joint.hold_stiffness * joint.stance);
    }
  }
}

/// What is on its way to and from the drives, oldest last.
template <class S>
template <class F>
void LaneWalker<S>::each_on_bus(const OnMark& robot, F&& f) {
  for (std::uint32_t back = 1; back <= robot.longest_delay + 1; ++back) {
    S* row = commands_.data() + ((now_ - back) & (command_rows_ - 1)) * joints();
    for (std::size_t j = 0; j < joints(); ++j) f(row[j]);
  }
  const std::size_t width = 3 * joints() + 3;
  for (std::uint32_t back = 1; back <= robot.oldest_sample; ++back) {
    S* row = samples_.data() + ((now_ - back) & (sample_rows_ - 1)) * width;
    for (std::size_t n = 0; n < width; ++n) f(row[n]);
  }
}

template <class S>
void LaneWalker<S>::keep(int lane, Stood& stood) {
  const auto n = static_cast<std::size_t>(lane);
  stood.mark = mark_[n];
  stood.ticks = now_ - placed_[lane];
  stood.acting_age = now_ - acting_[lane];
  stood.arrived_age = now_ - arrived_[n];
  stood.let_go = let_go_[n];
  const auto take = [&](S& number) { stood.numbers.push_back(number[lane]); };
  each_number(figures().robot.tree, robot_, take);
  for (std::size_t j = 0; j < joints(); ++j) take(torque_.values[j]);
  each_on_bus(stood.mark, take);
}

template <class S>
void LaneWalker<S>::put(int lane, const Stood& stood) {
  const auto n = static_cast<std::size_t>(lane);
  put_site(lane, stood.mark);
  const double* next = stood.numbers.data();
  const auto give = [&](S& number) { number.put(lane, static_cast<T>(*next++)); };
  each_number(figures().robot.tree, robot_, give);
  for (std::size_t j = 0; j < joints(); ++j) give(torque_.values[j]);
  each_on_bus(stood.mark, give);
  placed_.put(lane, now_ - stood.ticks);
  ticks_.put(lane, static_cast<T>(stood.ticks));
  acting_.put(lane, now_ - stood.acting_age);
  arrived_[n] = now_ - stood.arrived_age;
  let_go_[n] = stood.let_go;
  torque_from_.put(lane, 0);
  // Yaw, place and speed count from here.
  const auto& body = robot_.body;
  const stub::Quat<double> attitude{body.attitude.w[lane], body.attitude.x[lane], body.attitude.y[lane],
                                    body.attitude.z[lane]};
  const stub::Rotation<double> r = stub::rotation_of(attitude);
  const double yaw = std::atan2(r.x.y, r.x.x);
  PASTERN_LANES_SET::put(lane, yaw, own_.yaw);
  PASTERN_LANES_SET::put(lane, std::cos(yaw), own_.cosine);
  PASTERN_LANES_SET::put(lane, std::sin(yaw), own_.sine);
  own_.x.put(lane, body.position.x[lane]);
  own_.y.put(lane, body.position.y[lane]);
}

template <class S>
void LaneWalker<S>::make_room(const OnMark& robot) {
  make_room(commands_, command_rows_, robot.longest_delay + 2, joints());
  if (slow_bus_) make_room(samples_, sample_rows_, robot.oldest_sample + 1, 3 * joints() + 3);
}

template <class S>
void LaneWalker<S>::make_room(std::vector<S>& ring, std::uint32_t& rows, std::uint32_t wanted,
                              std::size_t width) {
  if (rows >= wanted) return;
  const std::uint32_t more = std::bit_ceil(std::max(wanted, 32U));
  std::vector<S> larger(more * width, S(T(0)));
  for (std::uint32_t back = 1; back <= rows; ++back) {
    const std::uint32_t tick = now_ - back;
    std::copy_n(ring.data() + (tick & (rows - 1)) * width, width,
                larger.data() + (tick & (more - 1)) * width);
  }
  ring.swap(larger);
  rows = more;
}

std::unique_ptr<Walker> make_lane_walker(std::shared_ptr<const WalkSettings> settings, Numbers numbers);

std::unique_ptr<Walker> make_lane_walker(std::shared_ptr<const WalkSettings> settings, Numbers numbers) {
  if (numbers == Numbers::full) return std::make_unique<LaneWalker<Doubles>>(std::move(settings));
  return std::make_unique<LaneWalker<Floats>>(std::move(settings));
}

}  // namespace pastern::packed::PASTERN_LANES_SET
