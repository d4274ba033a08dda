// A session as a pure state machine: baseline -> search -> confirmation -> verdict. No clock, no file, no
// thread; the same committed results in the same order give the same orders, so that a session is resumed by
// telling a new one what the journal holds.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/link.pb.h"
#include "pastern/v1/plan.pb.h"
#include "runtime/types/episode.h"
#include "runtime/types/parameters.h"

namespace pastern::adapt {
class Operator;
}

namespace pastern::session {

/// Walks of a plan at the most, voids not counted.
[[nodiscard]] std::uint64_t walks_planned(const v1::Plan& plan);

struct SessionStart {
  v1::Plan plan;  ///< checked (proto/files/plan_file.h)
  Parameters start;
  std::vector<Group> groups;
  std::optional<Parameters> candidate;  ///< with OFFERED_CANDIDATE, and only then
};

/// Why a session cannot begin (candidate missing, not finite, another size, outside the trust region); empty
/// when it can.
[[nodiscard]] std::string refusal(const SessionStart& start);

class Session {
 public:
  /// `refusal(start)` is empty.
  explicit Session(SessionStart start);
  ~Session();
  Session(Session&&) noexcept;
  Session& operator=(Session&&) noexcept;

  /// The walk wanted next; nothing when the session has ended.
  [[nodiscard]] const std::optional<Order>& next() const { return next_; }
  /// The result of next(), void or not. `robot_time_s`: the robot's own time since the session began, at the
  /// walk's end. A result of another batch or index than next()'s is refused: false, nothing changed.
  [[nodiscard]] bool take(const Committed<Evaluation>& evaluation, double robot_time_s);

  /// Set once next() is empty. `adapted_sha256` is left for the caller.
  [[nodiscard]] const std::optional<v1::Verdict>& verdict() const { return verdict_; }
  /// What is to be written when an operator ends the session before its verdict: keep.
  [[nodiscard]] v1::Verdict ended_by_operator() const;

  [[nodiscard]] v1::SessionPart part() const { return part_; }
  /// The parameters that the search, or the offer, names now; the start's before anything was learned.
  [[nodiscard]] const Parameters& adapted() const;
  [[nodiscard]] std::uint64_t walks_planned() const;
  [[nodiscard]] std::uint64_t walks_done() const { return walks_; }  ///< voids counted
  [[nodiscard]] std::uint32_t falls() const { return falls_; }
  [[nodiscard]] std::uint32_t voids() const { return voids_; }
  [[nodiscard]] double start_return() const;  ///< mean of the baseline walks; 0 before the first
  [[nodiscard]] double best_return() const { return best_return_; }  ///< of the search's walks; 0 before

 private:
  void take_void(bool by_person);
  void take_baseline(double total);
  void take_search(const Committed<Evaluation>& evaluation, double total);
  void take_confirmation(double total, bool fell);
  void begin_search();
  void order_search();
  void end_search(const std::string& why);
  void begin_confirmation();
  void order_confirmation();
  void order(Part part, std::uint32_t batch, std::uint32_t index, const Parameters& parameters);
  void judge();
  void keep(const std::string& words);
  [[nodiscard]] bool improved() const;
  [[nodiscard]] bool minutes_used(std::uint64_t walks_to_come) const;

  SessionStart given_;
  std::unique_ptr<adapt::Operator> operator_;  // none with an offered candidate
  std::optional<Order> next_;
  std::optional<v1::Verdict> verdict_;
  v1::SessionPart part_{v1::IN_BASELINE};
  std::uint64_t walks_{0};
  std::uint32_t falls_{0};
  std::uint32_t voids_{0};
  std::uint32_t repeats_{0};  // voids of the present order, but for those that a person stopped
  double time_s_{0};

  std::uint32_t baseline_done_{0};
  double baseline_sum_{0};
  std::uint32_t search_done_{0};
  std::size_t batch_position_{0};
  double batch_sum_{0};
  std::optional<double> last_batch_mean_;
  double best_return_{0};
  std::string search_ended_;  // why, in words

  std::uint32_t pair_{0};
  std::uint32_t confirmation_falls_{0};
  double first_of_pair_{0};
  bool second_walk_{false};
  std::vector<double> differences_;  // adapted less start, a number a pair
};

}  // namespace pastern::session
