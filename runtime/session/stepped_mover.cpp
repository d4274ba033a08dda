// The caller's thread is the cycle's: nothing happens between motions.
#include "runtime/session/mover.h"

namespace pastern::session {
namespace {

class SteppedMover final : public Mover {
 public:
  explicit SteppedMover(Cycle& cycle) : cycle_(cycle) {}

  MotionResult move(Motion motion, double duration_s, const Serve& serve) override {
    (void)serve;
    return cycle_.run(motion, duration_s);
  }

  bool set_down(std::uint64_t draw, std::string& words) override {
    if (cycle_.drives().simulated() && !cycle_.drives().carry_back(draw)) {
      words = std::string("the simulated robot was not put back: ") + cycle_.drives().error_text();
      return false;
    }
    cycle_.set_down();
    return true;
  }

  bool release(std::string& words) override {
    (void)cycle_.run(Motion::parked, cycle_.period_s());
    if (cycle_.gate().release()) return true;
    words = release_refused(cycle_.report());
    return false;
  }

  CycleReport report() override { return cycle_.report(); }
  void load(const Parameters& parameters) override { cycle_.load(parameters); }
  void change_policy(const v1::Policy& policy) override { cycle_.change_policy(policy); }
  v1::CarriedState save() override { return cycle_.save(); }
  bool restore(const v1::CarriedState& state) override { return cycle_.restore(state, true); }
  bool simulated() const override { return cycle_.drives().simulated(); }
  Pace pace() const override { return Pace::stepped; }
  Signals& signals() override { return cycle_.signals(); }
  std::string scheduling() const override { return "stepped: simulated time, no scheduling"; }

 private:
  Cycle& cycle_;
};

}  // namespace

// Sequentially consistent on purpose: whoever stops raises the count first and sets the flag second. Either
// the count is seen here, or the flag is set after it was cleared.
bool clear_stops(Signals& signals, std::uint64_t stops_seen) {
  if (signals.stops_asked.load() != stops_seen) return false;
  signals.stop.store(false);
  signals.halt.store(false);
  if (signals.stops_asked.load() != stops_seen) {
    signals.stop.store(true);
    return false;
  }
  clear_own_stop(signals);
  return true;
}

void clear_own_stop(Signals& signals) { signals.internal_stop.store(false); }

std::string release_refused(const CycleReport& report) {
  if (report.phase == safety::Phase::armed) return "nothing has tripped";
  if (report.phase != safety::Phase::off) return "the stop sequence has not ended; try again in two seconds";
  return std::string("the gate still sees a cause (tripped by ") + safety::name(report.trip.cause) +
         "); remove it and release again";
}

std::unique_ptr<Mover> make_stepped_mover(Cycle& cycle) { return std::make_unique<SteppedMover>(cycle); }

}  // namespace pastern::session
