// What a gate may never do, judged from limits and inputs alone: shares no code with the gate. It knows the
// causes that need no filter (a gate may know more); a cause that it knows must never pass.
#pragma once

#include <cstdint>
#include <string>

#include "safety/frames.h"
#include "safety/gate.h"
#include "safety/limits.h"

namespace pastern::safety::test {

/// Everything that goes into one tick.
struct Input {
  SensorFrame frame;
  Torques<> wanted;
  JointAngles<> target;
  Flags flags;
  TimeNs now;
  double late_s{0};
};

class Oracle {
 public:
  explicit Oracle(const Limits& limits);

  /// Empty, or what was wrong with the command. `armed_before`, `armed_after`: the gate's own word.
  [[nodiscard]] std::string judge(const Input& in, bool armed_before, const DriveCommand& out,
                                  bool armed_after);
  /// Empty, or why the gate must not have released.
  [[nodiscard]] std::string judge_release(bool released);
  /// The gate's filters were reset.
  void reset();

  struct Seen {
    int powered{0};  ///< ticks with torque
    int ramps{0};    ///< stops that kept torque for a while
    int cuts{0};     ///< stops that took it at once
    int releases{0};
    int causes{0};  ///< ticks with a cause that this oracle knows
  };
  [[nodiscard]] const Seen& seen() const { return seen_; }

 private:
  /// Adds every known cause present to all_ and those that forbid torque in this very tick to at_once_.
  void find(const Input& in, bool armed_before);
  void note(Cause cause);
  void find_in_flags(const Input& in);
  void find_in_frame(const Input& in, bool fresh);
  void find_in_joint(const Input& in, int joint, bool fresh);
  void find_age(const Input& in, bool fresh);
  [[nodiscard]] std::string envelope(const DriveCommand& out) const;
  [[nodiscard]] std::string damping_only(const Input& in, const DriveCommand& out) const;
  [[nodiscard]] std::string stopping(const Input& in, const DriveCommand& out);
  [[nodiscard]] bool overdue(const Input& in) const;

  Limits limits_;
  int joints_;
  double tick_s_;
  Torques<> last_;
  bool powered_{false};
  bool wanted_{false};
  std::string causes_;  ///< their names, for the message
  bool at_once_{false};
  bool any_{false};
  bool always_{false};    ///< a cause that stands in the way of a release
  bool latched_{false};   ///< torque was refused although wanted, or a cause was seen while it was off
  bool stopping_{false};  ///< a cause was seen while torque was on
  std::int64_t stop_calls_{0};
  TimeNs stop_began_;
  TimeNs last_now_;
  bool clock_went_back_{false};
  std::uint64_t ticks_{0};
  bool have_frame_{false};
  std::uint64_t counter_{0};
  JointAngles<> angle_;
  std::int64_t age_calls_{0};
  Seen seen_;
};

}  // namespace pastern::safety::test
