// The simulated robot against DART 6.12 (tests/external/multibody): accelerations over random states, and the
// time of a step with four feet on the floor. The simulated robot's step has drives, heat and pack in it; the
// library's has not.
#include <fmt/format.h>
#include <sched.h>
#include <time.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <vector>

#include "tests/bench/promise.h"
#include "tests/external/multibody/comparison.h"
#include "tests/external/multibody/reference.h"
#include "tests/external/multibody/simulated.h"

namespace pastern::bench {
namespace {

using namespace multibody;

constexpr double kStep_s = 0.001;
constexpr double kFriction = 0.8;
constexpr int kLook = 50;

struct Options {
  int states{2000};
  int states_a_body{20};
  int rounds{11};
  int steps{20000};  // of the simulated robot in a round; the library makes a fortieth of them
  std::uint64_t seed{1};
};

double now_s() {
  timespec now{};
  clock_gettime(CLOCK_MONOTONIC, &now);
  return static_cast<double>(now.tv_sec) + 1e-9 * static_cast<double>(now.tv_nsec);
}

/// Stays on the processor that it is on.
bool pin() {
  const int cpu = sched_getcpu();
  if (cpu < 0) return false;
  cpu_set_t set;
  CPU_ZERO(&set);
  CPU_SET(static_cast<unsigned>(cpu), &set);
  return sched_setaffinity(0, sizeof set, &set) == 0;
}

double median(std::vector<double> a) {
  std::nth_element(a.begin(), a.begin() + static_cast<std::ptrdiff_t>(a.size() / 2), a.end());
  return a[a.size() / 2];
}

// Accelerations
// -------------------------------------------------------------------------------------------------

void measure_difference(const Options& options) {
  for (const Shape& shape : shapes()) {
    for (const bool loaded : {false, true}) {
      const Compared c = compare(shape, loaded, options.states, options.states_a_body, options.seed);
      promise(fmt::format("accelerations against DART, {}{}", shape.name, loaded ? ", friction" : ""),
              fmt::format("{:.1e} in {} states (its two ways {:.1e})", c.worst, c.states, c.reference),
              "<= 1e-10", c.states == options.states && c.worst <= 1e-10);
    }
  }
}

// Time of a step
// -------------------------------------------------------------------------------------------------

/// Holds the stance by PD with the robot file's gains.
class Stance {
 public:
  explicit Stance(const v1::Robot& robot) {
    for (const auto& joint : robot.joints()) {
      target_.push_back(joint.stance_rad());
      stiffness_.push_back(joint.stiffness_nm_per_rad());
      damping_.push_back(joint.damping_nm_s_per_rad());
    }
    angle_.resize(target_.size());
    speed_.resize(target_.size());
    torque_.resize(target_.size());
  }
  const std::vector<double>& angles() const { return target_; }
  template <class Body>
  const std::vector<double>& torque(const Body& body) {
    body.read(angle_, speed_);
    for (std::size_t j = 0; j < torque_.size(); ++j) {
      torque_[j] = stiffness_[j] * (target_[j] - angle_[j]) - damping_[j] * speed_[j];
    }
    return torque_;
  }

 private:
  std::vector<double> target_;
  std::vector<double> stiffness_;
  std::vector<double> damping_;
  std::vector<double> angle_;
  std::vector<double> speed_;
  std::vector<double> torque_;
};

Motion standing(const Stance& stance, double height) {
  Motion motion;
  motion.position = {0, 0, height};
  motion.angle = stance.angles();
  motion.speed.assign(motion.angle.size(), 0);
  return motion;
}

/// us a step; of every kLook-th is counted whether it ended with four contacts.
template <class Step, class Body>
double time_steps(int steps, Stance& stance, Body& body, Step&& step, long& with_four) {
  const double began = now_s();
  for (int k = 0; k < steps; ++k) {
    step(stance.torque(body));
    if (k % kLook == 0) with_four += body.contacts() == 4 ? 1 : 0;
  }
  return 1e6 * (now_s() - began) / steps;
}

constexpr std::array kWays{Way::plain, Way::fitted, Way::body};

struct Times {
  std::vector<double> reference;
  std::array<std::vector<double>, 3> ours;  // by way
  std::array<std::vector<double>, 3> ratio;
  long reference_with_four{0};
  long with_four{0};
  double lowest_m{0};
};

/// Steps of the library in a round.
int few_of(const Options& options) { return std::max(1, options.steps / 40); }

Times time_all(const std::string& name, const Options& options) {
  const v1::Robot robot = shipped(name);
  Stance stance(robot);
  Simulated simulated(robot);
  simulated.set_friction(true);
  const Motion start = standing(stance, simulated.model().stance_height_m());
  Reference reference(robot);
  reference.put_on_floor(kFriction, kStep_s);
  reference.place(start);
  Times t;
  const int few = few_of(options);
  const auto as = [&](Way way) {
    simulated.place(start);
    return time_steps(
        options.steps, stance, simulated,
        [&](const std::vector<double>& torque) { simulated.step(torque, kStep_s, way); }, t.with_four);
  };
  const auto library = [&] {
    return time_steps(
        few, stance, reference, [&](const std::vector<double>& torque) { reference.step(torque); },
        t.reference_with_four);
  };
  (void)library();  // feet settle, caches warm
  for (const Way way : kWays) (void)as(way);
  t.with_four = t.reference_with_four = 0;
  for (int r = 0; r < options.rounds; ++r) {
    t.reference.push_back(library());
    for (const Way way : kWays) {
      const auto w = static_cast<std::size_t>(way);
      t.ours[w].push_back(as(way));
      t.ratio[w].push_back(t.reference.back() / t.ours[w].back());
    }
  }
  t.lowest_m = std::min(reference.trunk_height_m(), simulated.trunk_height_m());
  return t;
}

void measure_time(const std::string& name, const Options& options) {
  const Times t = time_all(name, options);
  const auto looks = [](int steps) { return (steps + kLook - 1) / kLook; };
  const double all_ours = static_cast<double>(kWays.size()) * options.rounds * looks(options.steps);
  const double all_reference = static_cast<double>(options.rounds) * looks(few_of(options));
  const double share = std::min(static_cast<double>(t.with_four) / all_ours,
                                static_cast<double>(t.reference_with_four) / all_reference);
  const bool stood = share > 0.95 && t.lowest_m > 0.2;
  const auto told = [&](Way way) {
    const auto w = static_cast<std::size_t>(way);
    return fmt::format("{:.1f} x ({:.1f} / {:.2f} us)", median(t.ratio[w]), median(t.reference),
                       median(t.ours[w]));
  };
  promise(fmt::format("step, 4 contacts, against DART's: {}, scalar double", name), told(Way::body),
          ">= 40 x", stood && median(t.ratio[static_cast<std::size_t>(Way::body)]) >= 40);
  promise(fmt::format("with drives, heat, pack, legs side by side: {}", name), told(Way::fitted), ">= 40 x",
          stood && median(t.ratio[static_cast<std::size_t>(Way::fitted)]) >= 40);
  printed(fmt::format("the same, one leg after another: {}", name), told(Way::plain));
  printed(fmt::format("steps with 4 contacts; trunk at the end: {}", name),
          fmt::format("{:.1f} %; {:.3f} m", 100 * share, t.lowest_m));
}

}  // namespace
}  // namespace pastern::bench

int main(int argc, char** argv) {
  using namespace pastern::bench;
  Options options;
  CLI::App app{"The simulated robot against DART: accelerations, time of a step"};
  app.add_option("--states", options.states, "random states a row")->check(CLI::Range(1, 1000000));
  app.add_option("--states-a-body", options.states_a_body, "before the next tree is drawn")
      ->check(CLI::Range(1, 1000000));
  app.add_option("--rounds", options.rounds, "interleaved rounds of the timing")->check(CLI::Range(5, 1001));
  app.add_option("--steps", options.steps, "of the simulated robot in a round")
      ->check(CLI::Range(400, 1000000));
  app.add_option("--seed", options.seed, "of robots, states and torques");
  CLI11_PARSE(app, argc, argv);
  measure_difference(options);
  if (!pin()) printed("pinning", "refused: times are those of a thread that may move");
  for (const char* name : {"dunlin12", "dunlin8"}) measure_time(name, options);
  return 0;
}
