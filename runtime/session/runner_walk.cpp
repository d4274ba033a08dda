// One walk: on the mark -> cool -> rise -> stand -> walk -> settle -> lower -> on disk; and
// what is done about trips.
#include "runtime/session/blend.h"
#include "runtime/session/runner.h"

namespace pastern::session {
namespace {

constexpr double kCoolStep_s = 1.0;
constexpr double kLongestCool_s = 3600.0;
constexpr double kLongestPack_s = 600.0;
constexpr const char* kTripKey = "latched_trip";
constexpr double kLongestTrip_s = 30.0;  // a simulated robot's fault that does not go away

}  // namespace

bool Runner::make_ready(const Order& order, Ended& ended) {
  voidable_ = 0;
  std::string words;
  if (!mover_.set_down(order.draw, words)) {
    ended = leave_session(Ended::How::interrupted, words);
    return false;
  }
  (void)move(Motion::parked, kOnTheMark_s, v1::PARKED);
  while (true) {
    if (!tripped()) {
      // A release takes a tick. A resumed session is no longer tripped and must meet the same ticks.
      (void)move(Motion::parked, 0, v1::PARKED);
    } else if (!out_of_trip(ended)) {
      return false;
    }
    if (!cool_down(ended)) return false;
    if (!tripped()) return true;
  }
}

bool Runner::out_of_trip(Ended& ended) {
  std::string words;
  double waited_s = 0;
  while (tripped()) {
    if (!releases_itself(mover_.report().trip)) {
      if (!wait_for("release", ended)) return false;
    } else if (!release_itself(words)) {
      if (waited_s >= kLongestTrip_s) {
        ended = leave_session(Ended::How::interrupted, "the robot does not come out of its trip: " + words);
        return false;
      }
      (void)move(Motion::parked, kCoolStep_s, v1::TRIPPED);
      waited_s += kCoolStep_s;
    }
    if (interrupted(ended)) return false;
  }
  return true;
}

// So that heat and sag do not pose as progress. Waiting is an order: simulated time passes in it.
bool Runner::cool_down(Ended& ended) {
  double waited_s = 0;
  while (true) {
    const safety::Hold hold = mover_.report().hold;
    if (hold == safety::Hold::none || hold == safety::Hold::tripped) return true;
    const bool pack = hold == safety::Hold::pack_floor;
    if (waited_s >= (pack ? kLongestPack_s : kLongestCool_s)) {
      ended = leave_session(Ended::How::interrupted,
                            pack ? "the pack stays below its floor; charge or change it, then resume"
                                 : "windings still too warm after an hour; find out why, then resume");
      return false;
    }
    (void)move(Motion::parked, kCoolStep_s, v1::WAITING);
    waited_s += kCoolStep_s;
    if (interrupted(ended)) return false;
    waiting_for_ = pack ? "pack" : "heat";
  }
}

bool Runner::perform(const Order& order, Ended& ended) {
  waiting_for_.clear();
  walking_ = order.walk;
  void_mark_.clear();
  mover_.load(order.parameters);
  const std::int64_t started_ns = session_ns();
  std::string void_reason;
  const MotionResult result = walk_through(order, void_reason);
  walking_ = 0;
  v1::Episode episode = episode_of(order, result, started_ns);
  if (!void_mark_.empty()) void_reason = void_mark_;
  if (!void_reason.empty()) {
    episode.set_outcome(v1::VOID);
    episode.set_void_reason(void_reason);
  }
  std::optional<Committed<Evaluation>> proof = commit(episode, order, ended);
  if (!proof) return false;
  if (session_) {
    const double ended_s = episode.started_s() + episode.summary().duration_s();
    if (!session_->take(*proof, ended_s)) {
      ended = leave_session(Ended::How::interrupted, "walk " + std::to_string(order.walk) + " does not fit");
      return false;
    }
    voidable_ = order.walk;
  }
  hooks_.on_episode(episode);
  return true;
}

MotionResult Runner::walk_through(const Order& order, std::string& void_reason) {
  MotionResult result = move(Motion::rise, 0, v1::RISING);
  if (!result.tripped) result = move(Motion::stand, kStand_s, v1::READY);
  if (result.tripped) {
    void_reason = std::string("tripped before the walk: ") + safety::name(result.trip.cause);
    result.outcome = Outcome::voided;
    return result;
  }
  result = move(Motion::walk, order.duration_s, v1::WALKING);
  if (result.outcome == Outcome::voided) void_reason = safety::name(result.trip.cause);
  if (!result.tripped) {
    MotionResult after = move(Motion::settle, 0, v1::SETTLING);
    if (!after.tripped) after = move(Motion::lower, 0, v1::LOWERING);
    if (after.tripped) {
      say("walk " + std::to_string(order.walk) + ": tripped after its end by " +
          safety::name(after.trip.cause));
    }
  }
  state_ = tripped() ? v1::TRIPPED : v1::PARKED;
  return result;
}

MotionResult Runner::move(Motion motion, double duration_s, v1::RobotState state) {
  state_ = state;
  moving_ = true;
  MotionResult result = mover_.move(motion, duration_s, [this] {
    hooks_.serve();
    keep_trip();
  });
  moving_ = false;
  keep_trip();
  return result;
}

std::optional<Committed<Evaluation>> Runner::commit(const v1::Episode& episode, const Order& order,
                                                    Ended& ended) {
  v1::CarriedState carried = mover_.save();
  carried.set_session_ns(session_ ? session_ns() : carried_.session_ns());
  std::string why;
  std::optional<Committed<Evaluation>> proof =
      journal_.commit(episode, order.parameters, carried.SerializeAsString(), why);
  if (!proof) {
    ended = leave_session(Ended::How::failed, "walk " + std::to_string(order.walk) +
                                                  " was not recorded: " + why + "; no further walk");
  }
  return proof;
}

bool Runner::tripped() { return mover_.report().phase != safety::Phase::armed; }

// A real robot waits for its operator, and so does a simulated one when a person, or the input that stands
// for one, has stopped it: also one that had tripped by something else before, and one of an earlier program.
bool Runner::releases_itself(const safety::Trip& trip) const {
  if (!mover_.simulated() || by_operator_ || trip_kept_) return false;
  const Signals& signals = mover_.signals();
  if (signals.stop.load(std::memory_order_acquire) || signals.halt.load(std::memory_order_acquire))
    return false;
  switch (trip.cause) {
    case safety::Cause::operator_stop:
    case safety::Cause::operator_halt:
    case safety::Cause::emergency_stop:
    case safety::Cause::baton_lost:
      return false;
    default:
      return true;
  }
}

// A latch must not be cleared by a restart: the gate of a new process is told to stop before anything else.
void Runner::recall_trip() {
  if (journal_.get(kTripKey).value_or("").empty()) return;
  trip_kept_ = true;
  mover_.signals().internal_stop.store(true, std::memory_order_release);
  rest();
}

// As soon as it is seen: a program that is killed in its stop sequence must come back tripped.
void Runner::keep_trip() {
  if (trip_kept_ || !tripped() || releases_itself(mover_.report().trip)) return;
  trip_kept_ = journal_.put(kTripKey, safety::name(mover_.report().trip.cause)).ok;
}

// What the next walk would do first. The robot is left as the record has it, so that a session begun now and
// one begun after a restart are the same.
void Runner::release_at_end() {
  std::string words;
  if (!tripped() || !releases_itself(mover_.report().trip) || !mover_.set_down(0, words)) return;
  (void)move(Motion::parked, kOnTheMark_s, v1::PARKED);
  if (release_itself(words) && mover_.pace() == Pace::stepped && carried_.ticks() > 0) {
    (void)mover_.restore(carried_);
  }
}

bool Runner::release_itself(std::string& words) {
  clear_own_stop(mover_.signals());
  return mover_.release(words);
}

bool Runner::release(std::string& words, std::uint64_t stops_seen) {
  if (moving_) {
    words = "the robot is moving or stopping; release when it has come to rest";
    return false;
  }
  if (!tripped()) {  // a stop that is set but not yet seen by the gate stays set
    words = "nothing has tripped";
    return false;
  }
  // Nobody can lift a simulated robot; the program does, as the operator would before releasing.
  if (mover_.simulated() && !mover_.set_down(0, words)) return false;
  const std::string cause = safety::name(mover_.report().trip.cause);
  if (!clear_stops(mover_.signals(), stops_seen)) {
    words = "a stop has come since the release was asked for; release again";
    return false;
  }
  if (!mover_.release(words)) return false;
  if (trip_kept_) trip_kept_ = !journal_.put(kTripKey, "").ok;
  state_ = v1::PARKED;
  words = "released after " + cause;
  say(words);
  return true;
}

}  // namespace pastern::session
