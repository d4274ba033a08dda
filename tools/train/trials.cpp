// A score goes to its own place, so that threads do not matter.
#include "tools/train/trials.h"

#include <algorithm>

#include "tools/train/pool.h"

namespace pastern::tools {
namespace {

class CourseTrials final : public Trials {
 public:
  explicit CourseTrials(std::vector<std::unique_ptr<Course>> courses) : courses_(std::move(courses)) {}

  std::vector<Score> run(const std::vector<Trial>& trials) override { return run_on(courses_, trials); }
  [[nodiscard]] double duration_s() const override { return courses_.front()->duration_s(); }

 private:
  std::vector<std::unique_ptr<Course>> courses_;
};

}  // namespace

std::vector<Score> run_on(const std::vector<std::unique_ptr<Course>>& courses,
                          const std::vector<Trial>& trials) {
  std::vector<Score> scores(trials.size());
  spread(static_cast<unsigned>(courses.size()), trials.size(), [&](unsigned worker, std::size_t i) {
    scores[i] = courses[worker]->run(*trials[i].parameters, trials[i].lot);
  });
  return scores;
}

std::vector<std::unique_ptr<Course>> courses_for(std::unique_ptr<Course> course, unsigned threads) {
  std::vector<std::unique_ptr<Course>> courses;
  courses.push_back(std::move(course));
  while (courses.size() < std::max(1U, threads)) courses.push_back(courses.front()->another());
  return courses;
}

std::unique_ptr<Trials> trials_on(std::vector<std::unique_ptr<Course>> courses) {
  return std::make_unique<CourseTrials>(std::move(courses));
}

}  // namespace pastern::tools
