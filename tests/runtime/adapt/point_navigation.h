// Point navigation with pushes: a point in the plane, a policy that gives its velocity, an unknown goal. The
// return is minus the distance to the goal at the end (the task of arXiv:1910.01215 and arXiv:2003.01239, in
// our own numbers).
#pragma once

#include <cmath>

#include "runtime/adapt/random.h"
#include "tests/runtime/adapt/on_disk.h"

namespace pastern::adapt {

struct PointNavigation {
  double goal_x{0};
  double goal_y{0};
  double push{0};  ///< standard deviation of the velocity pushes

  /// Parameters: velocity = W (x, y, 1), rows of W one after the other. One second in 20 steps.
  [[nodiscard]] double walk(const Parameters& w, std::uint32_t draw) const {
    double x = 0;
    double y = 0;
    for (std::uint32_t step = 0; step < 20; ++step) {
      const double vx = w[0] * x + w[1] * y + w[2] + push * random_normal(3, Stream::test, draw, 2 * step);
      const double vy =
          w[3] * x + w[4] * y + w[5] + push * random_normal(3, Stream::test, draw, 2 * step + 1);
      x += 0.05 * vx;
      y += 0.05 * vy;
    }
    return -std::hypot(x - goal_x, y - goal_y);
  }

  /// Mean distance to the goal over 200 walks of its own draws.
  [[nodiscard]] double distance(const Parameters& w) const {
    double sum = 0;
    for (std::uint32_t i = 0; i < 200; ++i) sum -= walk(w, 1000000 + i);
    return sum / 200;
  }
};

/// A start policy that knows no goal: it draws back to the middle, gently.
inline const Parameters kNavigationStart{-0.5, 0.1, 0.1, -0.1, -0.5, 0.1};

/// Mean distance to the goal after `walks` walks, over the four corners and five seeds.
inline double distance_after(Settings settings, std::uint32_t walks) {
  double sum = 0;
  for (std::uint64_t seed = 1; seed <= 5; ++seed) {
    for (const auto& [x, y] : {std::pair{1.0, 1.0}, {1.0, -1.0}, {-1.0, 1.0}, {-1.0, -1.0}}) {
      const PointNavigation task{x, y, 0.5};
      settings.seed = seed;
      const auto adaptation = make_operator(settings, kNavigationStart);
      std::uint32_t number = 0;
      while (number + adaptation->batch().size() <= walks) {
        const std::vector<Proposal> batch = adaptation->batch();
        for (const Proposal& p : batch)
          (void)adaptation->observe(walked(p.batch, p.index, task.walk(p.parameters, number++)));
      }
      sum += task.distance(adaptation->incumbent());
    }
  }
  return sum / 20;
}

}  // namespace pastern::adapt
