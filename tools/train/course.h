// What policies are trained and judged on: something that takes parameters and gives a score.
#pragma once

#include <cstdint>
#include <memory>

#include "runtime/types/episode.h"
#include "runtime/types/parameters.h"

namespace pastern::tools {

/// Names one trial: the site and all chance of the walk are functions of it. Two policies with the same lot
/// meet the same site, the same start pose and the same pushes.
struct Lot {
  std::uint64_t seed{0};
  std::uint64_t number{0};
};

struct Score {
  EpisodeReturn terms;
  bool fell{false};
  double distance_m{0};  ///< along the lane, until the end or the fall
};

/// One thread uses one course.
class Course {
 public:
  virtual ~Course() = default;
  [[nodiscard]] virtual Score run(const Parameters& parameters, const Lot& lot) = 0;
  /// An independent one that gives the same scores, for another thread.
  [[nodiscard]] virtual std::unique_ptr<Course> another() const = 0;
  [[nodiscard]] virtual double duration_s() const = 0;
};

}  // namespace pastern::tools
