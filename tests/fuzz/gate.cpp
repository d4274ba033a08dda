// Any sequence of frames, torques, flags and clocks: the gate's output stays in the envelope, a trip stays
// until it is released, and torque is off within the stop sequence's time.
#include "safety/gate.h"

#include <cmath>

#include "tests/fuzz/input.h"
#include "tests/safety/fixture.h"

namespace pastern::fuzz {
namespace {

using namespace safety;

constexpr int kJoints = 3;
constexpr int kMostTicks = 400;

void fill(Input& in, SensorFrame& frame) {
  const std::uint8_t what = in.byte();
  for (int j = 0; j < kJoints; ++j) {
    if ((what & 1U) != 0) frame.angle[j] = in.number(1);
    if ((what & 2U) != 0) frame.speed[j] = in.number(10);
    if ((what & 4U) != 0) frame.torque[j] = in.number(20);
    if ((what & 8U) != 0) frame.winding[j] = frame.housing[j] = in.number(60);
  }
  if ((what & 16U) != 0) frame.rate = {in.number(3), in.number(3), in.number(3)};
  if ((what & 32U) != 0) frame.acceleration = {in.number(10), in.number(10), in.number(10)};
  if ((what & 64U) != 0) {
    frame.pack_voltage_v = in.number(40);
    frame.pack_current_a = in.number(50);
  }
  if ((what & 128U) != 0) {
    frame.joint_count = in.byte() % 64 == 0 ? in.byte() : kJoints;
    frame.emergency_stop = in.byte() % 16 == 0;
    frame.counter += in.byte();
    frame.time.value += in.byte() % 32 == 0 ? -5'000'000 : 0;
  }
}

class Watched {
 public:
  explicit Watched(const Limits& limits) : limits_(limits), gate_(limits) {}

  void tick(Input& in, const SensorFrame& frame, const Torques<>& wanted, const JointAngles<>& target) {
    const std::uint8_t flags = in.byte();
    Flags given;
    given.torque_wanted = flags < 230;
    given.stop = flags == 230;
    given.halt = flags == 231;
    given.baton_lost = flags == 232;
    given.bus_error = flags == 233;
    given.frame_new = flags % 16 != 7;
    given.watch_base = flags % 2 == 0;
    now_.value += flags == 234 ? 40'000'000 : 1'000'000;
    const DriveCommand command =
        gate_.judge(frame, wanted, target, given, now_, flags == 235 ? in.number(0.1) : 0);
    look(command);
    if (flags == 236 && gate_.release()) cause_ = Cause::none;
  }

 private:
  void look(const DriveCommand& command) {
    for (int j = 0; j < kMaxJoints; ++j) {
      const double torque = command.torque()[j];
      const double peak =
          j < limits_.joint_count ? limits_.joint[static_cast<std::size_t>(j)].peak_torque_nm : 0;
      expect(std::fabs(torque) <= peak, "no torque beyond the peak, and none on joints that are not there");
      const double step = limits_.joint[static_cast<std::size_t>(j)].slew_nm_per_s * limits_.tick_s;
      const bool damps = gate_.phase() != Phase::armed;
      expect(damps || !command.torque_on() ||
                 std::fabs(torque - last_[static_cast<std::size_t>(j)]) <= step * (1 + 1e-9),
             "no torque changes faster than the slew allows");
      last_[static_cast<std::size_t>(j)] = command.torque_on() ? torque : 0;
      expect(command.torque_on() || torque == 0, "torque off is zero torque");
    }
    if (gate_.phase() == Phase::off) expect(!command.torque_on(), "off is off");
    if (cause_ != Cause::none) {
      expect(gate_.trip().cause == cause_, "the first cause stays until the release");
      ticks_tripped_ += 1;
      const double most = limits_.damp_s + limits_.lower_s;
      expect(ticks_tripped_ * limits_.tick_s <= most + 0.005 || !command.torque_on(),
             "torque is off within the stop sequence's time");
    } else {
      ticks_tripped_ = 0;
    }
    cause_ = gate_.trip().cause;
  }

  Limits limits_;
  Gate gate_;
  TimeNs now_{};
  Cause cause_{Cause::none};
  int ticks_tripped_{0};
  std::array<double, kMaxJoints> last_{};
};

}  // namespace
}  // namespace pastern::fuzz

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace pastern;
  fuzz::Input in(data, size);
  fuzz::Watched gate(safety::test::some_limits(fuzz::kJoints));
  safety::SensorFrame frame = safety::test::Loop().frame;
  safety::Torques<> wanted;
  safety::JointAngles<> target;
  for (int tick = 0; tick < fuzz::kMostTicks && !in.empty(); ++tick) {
    const std::uint8_t repeats = in.byte();
    fuzz::fill(in, frame);
    for (int j = 0; j < fuzz::kJoints; ++j) {
      wanted[j] = in.number(60);
      target[j] = in.number(1);
    }
    for (int i = 0; i <= repeats % 64; ++i) {
      ++frame.counter;
      frame.time.value += 1'000'000;
      frame.housing[0] += i % 2 == 0 ? 0.01 : -0.01;
      gate.tick(in, frame, wanted, target);
    }
  }
  return 0;
}
