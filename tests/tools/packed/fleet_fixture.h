// A field of walks for tests of fleets: short walks of a shipped robot over drawn sites, some of which fall.
#pragma once

#include <cmath>
#include <stdexcept>
#include <vector>

#include "tests/tools/train/robots.h"
#include "tools/packed/fleet.h"
#include "tools/train/sites.h"
#include "tools/train/trot.h"

namespace pastern::packed::test {

struct Field {
  explicit Field(const char* name = "dunlin12", double walk_s = 0.6)
      : robot(tools::test::robot(name)), policy(tools::open_loop_trot(robot.robot())) {
    std::string error;
    settings = walk_settings(robot.robot(), policy, walk_s, error);
    if (!settings) throw std::runtime_error(error);
    for (int n = 0; n < 5; ++n) {
      Parameters one(policy.parameters().begin(), policy.parameters().end());
      // The last ones throw the robot over.
      for (std::size_t i = 0; i < one.size(); ++i)
        one[i] += 0.1 * n * n * std::sin(1.0 + 7.0 * static_cast<double>(i));
      parameters.push_back(one);
    }
  }

  /// Pairs of a lot, as training has them.
  [[nodiscard]] std::vector<Trial> trials(std::size_t count) const {
    std::vector<Trial> made;
    for (std::size_t i = 0; i < count; ++i) made.push_back({&parameters[i % parameters.size()], {3, i / 2}});
    return made;
  }

  files::RobotFile robot;
  v1::Policy policy;
  std::shared_ptr<const WalkSettings> settings;
  std::vector<Parameters> parameters;
};

inline std::vector<tools::Score> scores_of(Fleet& fleet, const std::vector<Trial>& trials) {
  std::vector<tools::Score> scores(trials.size());
  fleet.run(trials, scores);
  return scores;
}

inline bool same(const tools::Score& a, const tools::Score& b) {
  return a.terms.forward == b.terms.forward && a.terms.energy == b.terms.energy &&
         a.terms.drift == b.terms.drift && a.terms.turn == b.terms.turn && a.terms.fall == b.terms.fall &&
         a.fell == b.fell && a.distance_m == b.distance_m;
}

}  // namespace pastern::packed::test
