// A robot with every flaw that a site may have walks by lanes as it does alone: double lanes against the
// scalar course, over whole walks.
#include <gtest/gtest.h>

#include <cmath>

#include "proto/files/scenario_file.h"
#include "tests/tools/packed/fleet_fixture.h"

namespace pastern::packed {
namespace {

stub::Site site_of_text(const std::string& text, const files::RobotFile& robot, const stub::Model& model) {
  files::Defects defects;
  const auto scenario = files::parse_scenario("name: \"test\"\n" + text, "test", robot, defects);
  if (!scenario) throw std::runtime_error(files::lines(defects));
  return stub::site_of(*scenario, model, 1);
}

class Flaws : public ::testing::TestWithParam<const char*> {};

// The two round elsewhere (the fitted step adds the legs in another order): stiff contacts magnify that over
// a short walk, from 1e-16 by some ten powers of ten at the most.
TEST_P(Flaws, LanesWalkAsTheScalarCourseDoes) {
  const test::Field field("dunlin12", 0.6);
  std::string error;
  const auto setting = tools::WalkSetting::make(field.robot.robot(), field.policy, 0.6, error);
  ASSERT_NE(setting, nullptr) << error;
  const stub::Site site = site_of_text(GetParam(), field.robot, setting->model());
  tools::WalkCourse course(setting, tools::one_site(site));
  Fleet fleet(field.settings, tools::one_site(site), {1, widest_set(), Numbers::full});
  std::vector<Trial> trials;
  for (std::uint64_t n = 0; n < 5; ++n) trials.push_back({&field.parameters[0], {3, n}});
  const auto scores = test::scores_of(fleet, trials);
  for (std::size_t i = 0; i < trials.size(); ++i) {
    const tools::Score alone = course.run(*trials[i].parameters, trials[i].lot);
    EXPECT_NEAR(scores[i].distance_m, alone.distance_m, 1e-5) << i;
    EXPECT_NEAR(scores[i].terms.forward, alone.terms.forward, 1e-5) << i;
    EXPECT_NEAR(scores[i].terms.energy, alone.terms.energy, 1e-5) << i;
    EXPECT_EQ(scores[i].fell, alone.fell) << i;
  }
}

INSTANTIATE_TEST_SUITE_P(Each, Flaws,
                         ::testing::Values("", "joint_gear_loss: 0.12", "joint_stick_nm: 0.3",
                                           "shank_mass_ratio: 1.2 trunk_inertia_ratio: 1.3",
                                           "joint_backlash_rad: 0.012",
                                           "load_kg: 2 load_at_m { x: 0.05 y: 0.03 z: 0 } load_hangs_m: 0.12",
                                           "sensor_delay_s: 0.004", "imu_delay_s: 0.006",
                                           "frames_late: 0.05 frames_late_s: 0.003 frames_repeated: 0.05"));

}  // namespace
}  // namespace pastern::packed
