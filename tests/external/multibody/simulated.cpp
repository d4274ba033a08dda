#include "tests/external/multibody/simulated.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace pastern::multibody {
namespace {

std::shared_ptr<const stub::Model> model_of(const v1::Robot& robot) {
  std::string error;
  auto model = stub::Model::make(robot, error);
  if (!model) throw std::runtime_error(error);
  return model;
}

/// f(joint's index in the robot file, its angle's or speed's place) for every joint.
template <class F>
void for_joints(const stub::Tree<double>& tree, F&& f) {
  for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
      f(static_cast<std::size_t>(tree.leg[l].joint[i].order), l, i);
    }
  }
}

// The body's step alone, in the product's two forms for machines without and with AVX2
// (hal_stub/robot/advance.cpp).
#if defined(__x86_64__)
#define PASTERN_WIDE __attribute__((flatten, target("avx2,fma")))
bool is_wide() { return __builtin_cpu_supports("avx2") != 0 && __builtin_cpu_supports("fma") != 0; }
#else
#define PASTERN_WIDE __attribute__((flatten))
bool is_wide() { return false; }
#endif

__attribute__((flatten)) void body_plain(const stub::Tree<double>& tree,
                                         const stub::Surroundings<double>& around,
                                         const stub::Loads<double>& loads, double step_s,
                                         stub::BodyState<double>& state, stub::Work<double>& work) {
  stub::step_body(tree, around, loads, step_s, state, work);
}

PASTERN_WIDE void body_wide(const stub::Tree<double>& tree, const stub::Surroundings<double>& around,
                            const stub::Loads<double>& loads, double step_s, stub::BodyState<double>& state,
                            stub::Work<double>& work) {
  stub::step_body(tree, around, loads, step_s, state, work);
}

}  // namespace

Simulated::Simulated(const v1::Robot& robot) : model_(model_of(robot)), stepper_(model_->figures()) {
  const auto& tree = model_->figures().tree;
  site_.around.trunk = {tree.trunk.mass, tree.trunk.centre, tree.trunk.inertia};
  site_.drives.strength.fill(1);
  site_.drives.ambient = 25;
  site_.pack = {model_->figures().pack.nominal, model_->figures().pack.resistance};
  set_friction(false);
}

void Simulated::set_friction(bool on) {
  for (std::size_t j = 0; j < static_cast<std::size_t>(model_->joint_count()); ++j) {
    site_.drives.damping[j] = on ? model_->damping()[j] : 0;
    site_.drives.coulomb[j] = on ? model_->coulomb()[j] : 0;
  }
  stepper_.take_site(site_);
}

std::vector<double> Simulated::viscosity(const Motion& motion) const {
  std::vector<double> made;
  for (std::size_t j = 0; j < motion.speed.size(); ++j) {
    made.push_back(site_.drives.damping[j] +
                   site_.drives.coulomb[j] / std::max(std::fabs(motion.speed[j]), 0.05));
  }
  return made;
}

void Simulated::place(const Motion& motion) {
  state_ = {};
  auto& body = state_.body;
  const auto& q = motion.attitude;
  body.attitude = {q[0], q[1], q[2], q[3]};
  body.position = {motion.position[0], motion.position[1], motion.position[2]};
  body.velocity = {motion.velocity[0], motion.velocity[1], motion.velocity[2]};
  body.rate = {motion.rate[0], motion.rate[1], motion.rate[2]};
  for_joints(model_->figures().tree, [&](std::size_t j, std::size_t l, std::size_t i) {
    body.angle[l][i] = motion.angle[j];
    body.speed[l][i] = motion.speed[j];
    state_.drives.rotor_angle[j] = motion.angle[j];
    state_.drives.rotor_speed[j] = motion.speed[j];
  });
  state_.drives.winding.fill(25);
  state_.drives.housing.fill(25);
  state_.pack.charge = 0.6;
  state_.pack.voltage = model_->figures().pack.nominal;
}

void Simulated::step(const std::vector<double>& torque, double step_s, Way way) {
  if (way == Way::body) return step_body_alone(torque, step_s);
  std::copy(torque.begin(), torque.end(), told_.wanted.begin());
  if (way == Way::plain) {
    stub::step_plainly(model_->figures(), site_, told_, step_s, state_, work_);
  } else {
    stepper_.step(site_, told_, step_s, state_, work_);
  }
}

void Simulated::step_body_alone(const std::vector<double>& torque, double step_s) {
  const auto& figures = model_->figures();
  for_joints(figures.tree, [&](std::size_t j, std::size_t l, std::size_t i) {
    work_.loads[l][i] = {torque[j], figures.drive[j].rotor_inertia};
  });
  const auto step = is_wide() ? body_wide : body_plain;
  step(figures.tree, site_.around, work_.loads, step_s, state_.body, work_.body);
}

void Simulated::read(std::vector<double>& angle, std::vector<double>& speed) const {
  for_joints(model_->figures().tree, [&](std::size_t j, std::size_t l, std::size_t i) {
    angle[j] = state_.body.angle[l][i];
    speed[j] = state_.body.speed[l][i];
  });
}

Accelerations Simulated::accelerations(const Motion& motion, const Drives& drives, Way way) {
  place(motion);
  step(drives.torque, drives.step_s, way);
  Accelerations made;
  std::copy(std::begin(work_.body.acceleration), std::end(work_.body.acceleration), made.trunk.begin());
  std::vector<double> angle(motion.angle.size());
  made.joint.resize(motion.speed.size());
  read(angle, made.joint);
  for (std::size_t j = 0; j < made.joint.size(); ++j) {
    made.joint[j] = (made.joint[j] - motion.speed[j]) / drives.step_s;
    if (state_.drives.torque[j] != drives.torque[j]) throw std::runtime_error("a drive limited its torque");
  }
  return made;
}

int Simulated::contacts() const {
  int count = 0;
  for (const auto& leg : state_.body.grip.leg) {
    count += static_cast<int>(std::count_if(leg.begin(), leg.end(), [](double n) { return n > 0; }));
  }
  const auto& corners = state_.body.grip.corner;
  return count +
         static_cast<int>(std::count_if(corners.begin(), corners.end(), [](double n) { return n > 0; }));
}

}  // namespace pastern::multibody
