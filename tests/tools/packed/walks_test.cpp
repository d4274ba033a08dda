// Whole walks by lanes against the one robot of WalkCourse, and sets of instructions against each other.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "proto/files/policy_file.h"
#include "proto/files/scenario_file.h"
#include "tests/tools/packed/fleet_fixture.h"
#include "tools/train/packed_trials.h"

namespace pastern::packed {
namespace {

std::string shipped(const std::string& name) { return std::string(PASTERN_SOURCE_DIR) + "/hal_stub/" + name; }

struct Course {
  explicit Course(const std::string& name, double walk_s) : robot(tools::test::robot(name.c_str())) {
    files::Defects defects;
    const auto policy = files::read_policy(shipped("policies/" + name + ".policy"), robot, defects);
    if (!policy) throw std::runtime_error(files::lines(defects));
    parameters.assign(policy->policy().parameters().begin(), policy->policy().parameters().end());
    std::string error;
    setting = tools::WalkSetting::make(robot.robot(), policy->policy(), walk_s, error);
    if (!setting) throw std::runtime_error(error);
  }
  files::RobotFile robot;
  Parameters parameters;
  std::shared_ptr<const tools::WalkSetting> setting;
};

std::vector<tools::Score> by_lanes(const Course& course, const tools::SiteChoice& sites, std::size_t walks,
                                   InstructionSet set, Numbers numbers) {
  Fleet fleet(course.setting->for_lanes(), sites, {1, set, numbers});
  std::vector<Trial> trials;
  for (std::size_t i = 0; i < walks; ++i) trials.push_back({&course.parameters, {9, i}});
  return test::scores_of(fleet, trials);
}

/// |difference| of the returns of walks without a fall, sorted.
std::vector<double> against_one(const Course& course, const tools::SiteChoice& sites, std::size_t walks,
                                Numbers numbers) {
  const auto lanes = by_lanes(course, sites, walks, widest_set(), numbers);
  tools::WalkCourse one(course.setting, sites);
  std::vector<double> differences;
  for (std::size_t i = 0; i < walks; ++i) {
    const tools::Score score = one.run(course.parameters, {9, i});
    if (score.fell || lanes[i].fell) continue;
    differences.push_back(std::abs(score.terms.total() - lanes[i].terms.total()));
  }
  std::sort(differences.begin(), differences.end());
  return differences;
}

class PackedWalks : public ::testing::TestWithParam<const char*> {};

// Everything that a site may have but faults: a slow bus both ways, jitter, play, offsets, a tilted IMU.
stub::Site odd_site(const stub::Model& model) {
  stub::Site site = stub::nominal_site(model);
  site.sensor_delay_s = 0.005;
  site.command_delay_s = 0.008;
  site.command_jitter_s = 0.003;
  site.imu_tilt_rad = {0.01, -0.02, 0.01};
  site.push_m_per_s = 0.2;
  site.start_scatter_rad = 0.03;
  site.backlash_rad[1] = 0.01;
  site.zero_offset_rad[2] = 0.02;
  site.load_kg = 2;
  site.load_at_m = {0.05, 0.05, 0.1};
  return site;
}

// In double only rounding is left, which a second of walking with encoder steps and sliding feet blows up.
TEST_P(PackedWalks, OfDoubleLanesAreThoseOfOneRobot) {
  const Course course(GetParam(), 1);
  const auto odd = tools::one_site(odd_site(course.setting->model()));
  const auto differences = against_one(course, odd, 16, Numbers::full);
  ASSERT_GE(differences.size(), 12U);
  EXPECT_LE(differences[differences.size() / 2], 1e-9);
}

// The bar of single precision: a median of 1e-3 in return; walks are chaotic, so some are further off.
TEST_P(PackedWalks, OfFloatLanesAreNearThoseOfOneRobotOnEveryScenario) {
  const Course course(GetParam(), 2);
  for (const char* name : {"cold_store", "worn_knee", "late_bus", "wet_ramp", "good_day"}) {
    files::Defects defects;
    const auto scenario = files::read_scenario(shipped("scenarios/" + std::string(name) + ".scenario.txtpb"),
                                               course.robot, defects);
    ASSERT_TRUE(scenario) << files::lines(defects);
    const auto sites = tools::one_site(stub::site_of(*scenario, course.setting->model(), 1));
    const auto differences = against_one(course, sites, 16, Numbers::single);
    ASSERT_GE(differences.size(), 8U) << name;
    EXPECT_LE(differences[differences.size() / 2], 1e-3) << name;
  }
}

// Every set that this machine has: other rounding, the same walks.
TEST_P(PackedWalks, AgreeBetweenSetsOfInstructions) {
  const Course course(GetParam(), 1);
  const auto sites = tools::drawn_sites(tools::wide_ranges());
  const auto widest = by_lanes(course, sites, 40, widest_set(), Numbers::single);
  for (const InstructionSet set : sets_here()) {
    const auto scores = by_lanes(course, sites, 40, set, Numbers::single);
    std::vector<double> differences;
    for (std::size_t i = 0; i < scores.size(); ++i) {
      differences.push_back(std::abs(scores[i].terms.total() - widest[i].terms.total()));
    }
    std::sort(differences.begin(), differences.end());
    EXPECT_LE(differences[differences.size() / 2], 1e-3) << name_of(set);
  }
}

INSTANTIATE_TEST_SUITE_P(Shipped, PackedWalks, ::testing::Values("dunlin12", "dunlin8"),
                         [](const auto& one) { return std::string(one.param); });

}  // namespace
}  // namespace pastern::packed
