// Many trials at once: what training, looks and judgements ask for. The order of the scores is that of the
// trials, and a score depends on its trial alone, whoever runs it beside what others.
#pragma once

#include <memory>
#include <vector>

#include "tools/train/course.h"

namespace pastern::tools {

/// A walk of `parameters` at a lot.
struct Trial {
  const Parameters* parameters{nullptr};
  Lot lot;
};

class Trials {
 public:
  virtual ~Trials() = default;
  [[nodiscard]] virtual std::vector<Score> run(const std::vector<Trial>& trials) = 0;
  [[nodiscard]] virtual double duration_s() const = 0;  ///< of a walk without a fall
};

/// One course a thread, all alike.
[[nodiscard]] std::vector<std::unique_ptr<Course>> courses_for(std::unique_ptr<Course> course,
                                                               unsigned threads);

/// One walk after another on each thread, one course a thread, all alike.
[[nodiscard]] std::vector<Score> run_on(const std::vector<std::unique_ptr<Course>>& courses,
                                        const std::vector<Trial>& trials);
/// The same, with courses of its own.
[[nodiscard]] std::unique_ptr<Trials> trials_on(std::vector<std::unique_ptr<Course>> courses);

}  // namespace pastern::tools
