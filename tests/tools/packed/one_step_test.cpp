// One step of everything that moves, from random states: lanes against the plain step of one robot in double.
#include <gtest/gtest.h>

#include <algorithm>
#include <random>

#include "hal_stub/robot/advance.h"
#include "hal_stub/robot/model.h"
#include "hal_stub/robot/start.h"
#include "tests/tools/train/robots.h"
#include "tools/packed/functions.h"
#include "tools/packed/lane_site.h"
#include "tools/packed/narrow.h"
#include "tools/packed/plane_legs.h"

namespace pastern::packed::PASTERN_LANES_SET {
namespace {

constexpr double kDt = 0.001;

class States {
 public:
  explicit States(const char* name) {
    std::string error;
    model = stub::Model::make(tools::test::robot(name).robot(), error);
    if (!model) throw std::runtime_error(error);
  }
  double in(double low, double high) { return std::uniform_real_distribution<double>(low, high)(random_); }

  stub::Site site() {
    stub::Site made = stub::nominal_site(*model);
    made.load_kg = in(0, 4);
    made.load_at_m = {in(-0.1, 0.1), in(-0.1, 0.1), 0.1};
    made.friction = in(0.2, 1);
    made.slope_rad = in(-0.1, 0.1);
    made.pack_voltage_ratio = in(0.7, 1.05);
    made.strength.fill(in(0.5, 1));
    made.backlash_rad[2] = in(0, 1) < 0.5 ? 0 : 0.02;
    return made;
  }

  /// Near the stance, some feet in the ground, everything in motion.
  void draw(stub::RobotState<double>& state, stub::SiteFigures<double>& figures, stub::Told<double>& told) {
    const stub::Site here = site();
    figures = stub::figures_of(*model, here);
    state = stub::switch_on(*model, here, figures.pack);
    stub::place_in(*model, here, model->stance(), 1, static_cast<std::uint64_t>(in(0, 1e9)), state);
    auto& body = state.body;
    body.attitude =
        stub::turned_by(body.attitude, stub::Vec3<double>{in(-0.2, 0.2), in(-0.2, 0.2), in(-0.2, 0.2)});
    body.position = body.position + stub::Vec3<double>{in(-1, 1), in(-0.3, 0.3), in(-0.02, 0.01)};
    body.velocity = {in(-1, 1), in(-0.5, 0.5), in(-0.5, 0.5)};
    body.rate = {in(-2, 2), in(-2, 2), in(-2, 2)};
    figures.around.push = {in(-50, 50), in(-50, 50), 0};
    const auto& tree = model->figures().tree;
    for (std::size_t l = 0; l < static_cast<std::size_t>(tree.leg_count); ++l) {
      body.grip.leg[l][0] = in(0, 80);
      for (std::size_t i = 0; i < static_cast<std::size_t>(tree.leg[l].joint_count); ++i) {
        const auto j = static_cast<std::size_t>(tree.leg[l].joint[i].order);
        body.angle[l][i] += in(-0.3, 0.3);
        body.speed[l][i] = in(-5, 5);
        state.drives.rotor_angle[j] = body.angle[l][i] + (here.backlash_rad[j] > 0 ? in(-0.012, 0.012) : 0);
        state.drives.rotor_speed[j] = body.speed[l][i];
        state.drives.winding[j] = in(20, 90);
        told.wanted[j] = in(-30, 30);
      }
    }
    told.on = 1;
    told.damping = 0;
  }

  std::shared_ptr<const stub::Model> model;

 private:
  std::mt19937_64 random_{20261};
};

/// Sizes that count in each number: what is smaller is measured against it.
std::vector<double> sizes_of(const stub::Tree<double>& tree) {
  stub::RobotState<double> size;
  each_number(tree, size, [](double& number) { number = 1; });
  for (auto& leg : size.body.grip.leg) leg.fill(200);  // N
  size.body.grip.corner.fill(200);
  size.drives.torque.fill(30);
  size.drives.winding.fill(20);
  size.drives.housing.fill(20);
  size.pack.voltage = size.pack.current = 50;
  for (auto& leg : size.body.speed) leg.fill(10);
  size.drives.rotor_speed.fill(10);
  std::vector<double> sizes;
  each_number(tree, size, [&](double& number) { sizes.push_back(number); });
  return sizes;
}

/// Largest difference of each state after the step, relative, sorted.
template <class S, class Step>
std::vector<double> differences(const char* name, int states, Step step) {
  constexpr int lanes = S::kLanes;
  using C = typename S::Constant;
  States draws(name);
  const auto& figures = draws.model->figures();
  const auto narrow = narrowed<C>(figures);
  const auto joints = static_cast<std::size_t>(figures.tree.joint_count);
  const std::vector<double> sizes = sizes_of(figures.tree);
  std::vector<double> worst;
  for (int first = 0; first < states; first += lanes) {
    stub::RobotState<S> state{};
    stub::SiteFigures<S> site{};
    stub::Told<S> told{};
    stub::RobotWork<S> work{};
    std::vector<stub::RobotState<double>> after(lanes);
    for (int lane = 0; lane < lanes; ++lane) {
      auto& one = after[static_cast<std::size_t>(lane)];
      stub::SiteFigures<double> one_site;
      stub::Told<double> one_told;
      draws.draw(one, one_site, one_told);
      std::vector<double> numbers;
      each_number(figures.tree, one, [&](double& number) { numbers.push_back(number); });
      const double* next = numbers.data();
      each_number(figures.tree, state, [&](S& number) { put(lane, *next++, number); });
      put(lane, joints, one_site, site);
      put(lane, one_site.around.push, site.around.push);
      for (std::size_t j = 0; j < joints; ++j) put(lane, one_told.wanted[j], told.wanted[j]);
      put(lane, 1, told.on);
      put(lane, 0, told.damping);
      stub::RobotWork<double> one_work{};
      stub::step_plainly(figures, one_site, one_told, kDt, one, one_work);
    }
    for (std::size_t j = 0; j < joints; ++j) told.forced[j] = S(C(0));
    step(narrow, site, told, C(kDt), state, work);
    for (int lane = 0; lane < lanes; ++lane) {
      double most = 0;
      std::vector<double> found;
      each_number(figures.tree, state, [&](S& number) { found.push_back(number[lane]); });
      std::size_t n = 0;
      each_number(figures.tree, after[static_cast<std::size_t>(lane)], [&](double& number) {
        most = std::max(most, std::abs(found[n] - number) / std::max(std::abs(number), sizes[n]));
        ++n;
      });
      worst.push_back(most);
    }
  }
  std::sort(worst.begin(), worst.end());
  return worst;
}

constexpr auto kPlane = [](const auto& f, const auto& site, const auto& told, auto dt, auto& state,
                           auto& work) { step_plane_robot(f, site, told, dt, state, work); };
constexpr auto kGeneral = [](const auto& f, const auto& site, const auto& told, auto dt, auto& state,
                             auto& work) { stub::step_robot(f, site, told, dt, state, work); };

class OneStep : public ::testing::TestWithParam<const char*> {};

// Double lanes: other order of operations, other fusing. Bar: 1e-12.
TEST_P(OneStep, OfDoubleLanesIsThePlainStep) {
  EXPECT_LE((differences<Doubles>(GetParam(), 10000, kPlane).back()), 1e-12);
  EXPECT_LE((differences<Doubles>(GetParam(), 2000, kGeneral).back()), 1e-12);
}

// Float lanes: 1e-4. A point within rounding of the ground touches in one and not in the other; a thousandth
// of the states may be of that kind.
TEST_P(OneStep, OfFloatLanesIsNearThePlainStep) {
  const auto worst = differences<Floats>(GetParam(), 10000, kPlane);
  EXPECT_LE(worst[worst.size() * 999 / 1000], 1e-4);
  EXPECT_LE(worst[worst.size() / 2], 1e-5);
  RecordProperty("worst", std::to_string(worst.back()));
}

INSTANTIATE_TEST_SUITE_P(Shipped, OneStep, ::testing::Values("dunlin12", "dunlin8"),
                         [](const auto& one) { return std::string(one.param); });

}  // namespace
}  // namespace pastern::packed::PASTERN_LANES_SET
