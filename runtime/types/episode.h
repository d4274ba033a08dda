// An order and what came of it.
#pragma once

#include <cstdint>
#include <string>
#include <utility>

#include "runtime/types/parameters.h"

namespace pastern {

namespace journal {
class Journal;
}

enum class Part : std::uint8_t {
  baseline = 1,
  search = 2,
  confirmation_start = 3,
  confirmation_adapted = 4,
  single = 5
};
enum class Outcome : std::uint8_t { completed = 1, fell = 2, left_lane = 3, voided = 4 };

/// Return of one walk, every term on its own, in return units (metres with the default weights). Costs are
/// negative.
struct EpisodeReturn {
  double forward{0};
  double energy{0};
  double drift{0};
  double turn{0};
  double fall{0};

  [[nodiscard]] double total() const { return forward + energy + drift + turn + fall; }
};

/// In return units. An effect that is shown to be there and is smaller than this is told as real but of no
/// practical size. Our choice: an eightieth of the most that a walk of 5 s can earn (4.0). It changes the
/// words only, never the verdict's rule.
inline constexpr double kPracticalSize = 0.05;

/// The interval excludes 0 and the effect is smaller than kPracticalSize.
[[nodiscard]] constexpr bool of_no_practical_size(double effect, double low, double high) {
  return (low > 0 || high < 0) && effect > -kPracticalSize && effect < kPracticalSize;
}

/// One episode to run: what, for how long, and the random stream that belongs to it.
struct Order {
  std::uint64_t walk{0};  ///< 1, 2, 3 ... within the session, voids counted
  Part part{Part::baseline};
  std::uint32_t batch{0};
  std::uint32_t index{0};
  double duration_s{0};
  std::uint64_t draw{0};
  Parameters parameters;
};

/// What an adaptation operator may learn of a walk.
struct Evaluation {
  std::uint32_t batch{0};
  std::uint32_t index{0};
  Outcome outcome{Outcome::completed};
  EpisodeReturn terms;
  bool stopped_by_person{false};  ///< stop, halt or emergency stop: says nothing of the site or the policy
};

/// A value that is on disk. Only the journal can make one, after its commit; an operator takes nothing else.
template <class T>
class Committed {
 public:
  [[nodiscard]] const T& value() const { return value_; }

 private:
  friend class journal::Journal;
  explicit Committed(T value) : value_(std::move(value)) {}
  T value_;
};

}  // namespace pastern
