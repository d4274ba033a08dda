// Nothing in a tick's stages takes memory from the heap once they are made.
#include <gtest/gtest.h>

#include <atomic>
#include <cstdlib>
#include <new>

#include "runtime/control/pd.h"
#include "runtime/episode/recorder.h"
#include "runtime/estimate/estimator.h"
#include "runtime/policy/policy.h"
#include "tests/runtime/support/robots.h"

namespace {
std::atomic<long> taken{0};

void* take(std::size_t size, std::size_t alignment) {
  ++taken;
  void* memory = std::aligned_alloc(alignment, (size + alignment - 1) / alignment * alignment);
  if (memory == nullptr) {
    throw std::bad_alloc();
  }
  return memory;
}
}  // namespace

void* operator new(std::size_t size) { return take(size, alignof(std::max_align_t)); }
void* operator new[](std::size_t size) { return take(size, alignof(std::max_align_t)); }
void* operator new(std::size_t size, std::align_val_t alignment) {
  return take(size, static_cast<std::size_t>(alignment));
}
void operator delete(void* memory) noexcept { std::free(memory); }
void operator delete[](void* memory) noexcept { std::free(memory); }
void operator delete(void* memory, std::size_t /*size*/) noexcept { std::free(memory); }
void operator delete[](void* memory, std::size_t /*size*/) noexcept { std::free(memory); }
void operator delete(void* memory, std::align_val_t /*alignment*/) noexcept { std::free(memory); }
void operator delete(void* memory, std::size_t /*size*/, std::align_val_t /*alignment*/) noexcept {
  std::free(memory);
}

namespace pastern {
namespace {

TEST(Stages, TakeNoMemoryOnceTheyAreMade) {
  const v1::Robot robot = test::shipped_robot("dunlin12").robot();
  v1::Policy file = test::trot_policy(robot, 0.3, 0.03);
  for (const v1::Policy::Scalar scalar : {v1::Policy::DOUBLE, v1::Policy::FLOAT}) {
    file.set_scalar(scalar);
    const auto policy = policy::Policy::make(file, robot);
    const Parameters parameters(file.parameters().begin(), file.parameters().end());
    estimate::Estimator estimator(robot);
    episode::EpisodeRecorder recorder(robot);
    const auto gains = control::gains_of(robot);
    safety::SensorFrame frame;
    frame.joint_count = robot.joints_size();
    frame.acceleration.z = 9.80665;
    frame.has_position = true;
    for (int j = 0; j < robot.joints_size(); ++j) {
      frame.angle[j] = robot.joints(j).stance_rad();
    }

    const long before = taken;
    policy->load(parameters);
    policy->reset();
    estimator.begin(frame, true);
    recorder.begin();
    double sum = 0;
    for (int tick = 0; tick < 70000; ++tick) {  // longer than the trace has room for
      ++frame.counter;
      frame.position.x += 0.001;
      const BodyEstimate<>& body = estimator.update(frame, 0.001);
      const JointTarget<> target = policy->step(body, frame.angle, frame.speed, 0.02);
      const Torques<> torque = control::pd_torques(gains, target, frame.angle, frame.speed);
      episode::TickRecord record;
      record.body = body;
      record.power_w = episode::joint_power(torque, frame.speed, 12);
      recorder.add(record, {}, 0.001);
      sum += torque[1];
    }
    EXPECT_EQ(taken - before, 0);
    EXPECT_NE(sum, 0);
  }
  EXPECT_GT(taken, 0) << "the count must count";
}

}  // namespace
}  // namespace pastern
