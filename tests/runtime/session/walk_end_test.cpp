// A walk that ends well must end well: out of the trot, whatever its length, the robot comes to stand, lowers
// itself and parks without a trip. Both shipped robots with their start policies, all shipped scenarios.
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>

#include "runtime/session/blend.h"
#include "tests/runtime/session/setting.h"

namespace pastern::session {
namespace {

const std::string kFolder = std::string(PASTERN_SOURCE_DIR) + "/hal_stub/";
#ifdef __SANITIZE_ADDRESS__
constexpr int kWalks = 2;  // ten times slower there, and the numbers are the same
#else
constexpr int kWalks = 24;
#endif

/// Pushes come at any time, also into the end of a walk, and some of them fell a robot: not what is asked
/// here.
std::string without_pushes(const std::string& scenario, const std::string& folder) {
  std::ifstream from(kFolder + "scenarios/" + scenario + ".scenario.txtpb");
  EXPECT_TRUE(from.good()) << scenario;
  std::string path = folder + "/" + scenario + ".scenario.txtpb";
  std::ofstream to(path);
  for (std::string line; std::getline(from, line);) {
    if (line.rfind("push_m_per_s", 0) != 0) to << line << "\n";
  }
  return path;
}

struct Case {
  const char* robot;
  const char* scenario;
};

class WalkEnd : public testing::TestWithParam<Case> {
 protected:
  WalkEnd() : robot(test::shipped_robot(GetParam().robot)) {
    files::Defects defects;
    const auto policy =
        files::read_policy(kFolder + "policies/" + GetParam().robot + ".policy", robot, defects);
    EXPECT_TRUE(policy) << files::lines(defects);
    std::string options;
    if (*GetParam().scenario != 0) options = "scenario=" + without_pushes(GetParam().scenario, folder.path());
    std::string error;
    auto drives = hal::Drives::open(drives_config(robot, STUB_PATH, options, 17, Pace::stepped), error);
    if (!policy || !drives) {
      ADD_FAILURE() << error;
      std::abort();
    }
    cycle = std::make_unique<Cycle>(robot.robot(), policy->policy(), std::move(drives));
  }

  /// False when it did not rise or fell on its way: such a walk is not in question.
  bool walk(std::uint64_t draw, double duration_s) {
    EXPECT_TRUE(cycle->drives().carry_back(draw));
    cycle->set_down();
    (void)cycle->run(Motion::parked, kOnTheMark_s);
    if (cycle->gate().phase() != safety::Phase::armed) (void)cycle->gate().release();
    return cycle->run(Motion::rise, 0).completed && cycle->run(Motion::stand, kStand_s).completed &&
           cycle->run(Motion::walk, duration_s).completed;
  }

  double most_tilt_of(Motion motion) {
    double most = 0;
    cycle->begin(motion, 0);
    while (!cycle->done()) {
      cycle->tick({});
      most = std::max({most, std::fabs(cycle->gate().roll_rad()), std::fabs(cycle->gate().pitch_rad())});
    }
    return most;
  }

  test::TestFolder folder;
  files::RobotFile robot;
  std::unique_ptr<Cycle> cycle;
};

TEST_P(WalkEnd, ComesToStandAndParksAfterWalksOfAnyLength) {
  for (const double duration_s : {1.0, 2.5, 5.0}) {
    int whole = 0;
    for (std::uint64_t draw = 0; draw < kWalks; ++draw) {
      if (!walk(draw, duration_s)) continue;
      ++whole;
      const double settling = most_tilt_of(Motion::settle);
      EXPECT_TRUE(cycle->result().completed)
          << "settling, " << duration_s << " s, draw " << draw << ", "
          << safety::name(cycle->result().trip.cause) << ", tilt " << settling;
      if (!cycle->result().completed) continue;
      const double lowering = most_tilt_of(Motion::lower);
      EXPECT_TRUE(cycle->result().completed)
          << "lowering, " << duration_s << " s, draw " << draw << ", "
          << safety::name(cycle->result().trip.cause) << ", tilt " << lowering;
      EXPECT_EQ(cycle->report().motion, Motion::parked);
    }
    EXPECT_GE(whole, kWalks * 5 / 6) << duration_s;  // else too little was asked
  }
}

INSTANTIATE_TEST_SUITE_P(Sites, WalkEnd,
                         testing::Values(Case{"dunlin8", ""}, Case{"dunlin8", "cold_store"},
                                         Case{"dunlin8", "good_day"}, Case{"dunlin8", "late_bus"},
                                         Case{"dunlin8", "wet_ramp"}, Case{"dunlin8", "worn_knee"},
                                         Case{"dunlin12", ""}, Case{"dunlin12", "cold_store"},
                                         Case{"dunlin12", "good_day"}, Case{"dunlin12", "late_bus"},
                                         Case{"dunlin12", "wet_ramp"}, Case{"dunlin12", "worn_knee"}),
                         [](const testing::TestParamInfo<Case>& at) {
                           return std::string(at.param.robot) + (*at.param.scenario != 0 ? "_" : "") +
                                  at.param.scenario;
                         });

}  // namespace
}  // namespace pastern::session
