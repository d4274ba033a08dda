// The ground as a height field and its friction laws: against closed forms, and each scenario field seen.
#include <gtest/gtest.h>

#include "hal_stub/robot/start.h"
#include "tests/hal_stub/bodies.h"
#include "tests/hal_stub/robots.h"

namespace pastern::stub {
namespace {

constexpr double kPi = 3.14159265358979323846;

/// A ball of radius `radius` (a point when 0) on a ground: a trunk without corners and a foot at its middle.
struct Ball {
  TreeD tree;
  Surroundings<double> around;
  StateD state;
  Work<double> work{};

  Ball(double mass, double radius, double stiffness) {
    tree.gravity = 9.81;
    tree.trunk.mass = mass;
    const double i = std::max(0.4 * mass * radius * radius, 1e-6);
    tree.trunk.inertia = {i, i, i, 0, 0, 0};
    tree.half_size = {1e-9, 1e-9, 1e-9};
    // Out of the way: in the middle of a ball that rolls, far above a point that does not turn.
    for (auto& corner : tree.corner) corner = {0, 0, radius > 0 ? 0 : 1e3};
    tree.joint_count = tree.leg_count = 1;
    tree.leg[0].joint_count = 1;
    tree.leg[0].joint[0] = hinge(AxisKind::y, {0, 0, 0}, 1e-9, {0, 0, 0}, {1e-6, 1e-6, 1e-6});
    tree.leg[0].foot_radius = radius;
    around = in_the_air(tree);
    around.ground.stiffness = stiffness;
  }
  void step(double dt) {
    Loads<double> loads{};
    state.angle[0][0] = 0;
    state.speed[0][0] = 0;
    loads[0][0].inertia = 1e6;  // the foot is one with the trunk
    step_body(tree, around, loads, dt, state, work);
  }
  void go(double seconds, double dt) {
    for (long k = 0; k < std::lround(seconds / dt); ++k) step(dt);
  }
};

Ground<double> waves(double height, double length) {
  Site site;
  site.ground.wave_height_m = height;
  site.ground.wave_length_m = length;
  return ground_of(site);
}

TEST(Ground, GradientIsTheSlopeOfTheHeight) {
  Site site;
  site.ground.wave_height_m = 0.012;
  site.ground.wave_length_m = 0.7;
  site.ground.step_count = 2;
  site.ground.step[0] = {0.4, 0.05};
  site.ground.step[1] = {0.9, -0.03};
  const Ground<double> ground = ground_of(site);
  EXPECT_FALSE(ground.plain);
  for (double x = -0.5; x < 2; x += 0.0007) {
    const double h = 1e-6;
    const double slope =
        (profile_at(ground.relief, x + h).height - profile_at(ground.relief, x - h).height) / (2 * h);
    ASSERT_NEAR(profile_at(ground.relief, x).gradient, slope, 1e-4) << x;
    ASSERT_LE(profile_at(ground.relief, x).height, ground.relief.top + 1e-12);
  }
  EXPECT_NEAR(profile_at(ground.relief, 0.175).height, 0.006, 1e-12);  // half of crest to trough
  EXPECT_NEAR(profile_at(waves(0, 1).relief, 0.3).height, 0, 1e-15);
  // After both steps, at a whole number of waves.
  EXPECT_NEAR(profile_at(ground.relief, 1.4).height, 0.02, 1e-12);
}

// Depth and normal of a ball at rest over a sine, against the nearest point found by search.
TEST(Ground, DepthOfABallIsThatToTheNearestPoint) {
  const Ground<double> ground = waves(0.012, 0.7);
  const double radius = 0.02;
  const Rotation<double> level{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}};
  for (double x = 0; x < 0.7; x += 0.01) {
    const V3 centre{x, 0.1, profile_at(ground.relief, x).height + radius - 0.004};
    const Below<double> below = below_of(ground, level, V3{0, 0, 0});
    const ShapedFooting<double> on{ground, below, stand_of(ground, level, V3{0, 0, 0}), 1e-3};
    const Lie<double> lie = lie_of(on, centre, radius);
    double nearest = 1;
    double at = 0;
    for (double s = x - 0.1; s < x + 0.1; s += 1e-5) {
      const double d = std::hypot(s - x, profile_at(ground.relief, s).height - centre.z);
      if (d < nearest) {
        nearest = d;
        at = s;
      }
    }
    EXPECT_NEAR(lie.depth, radius - nearest, 2e-6) << x;
    EXPECT_NEAR(lie.normal.x, (x - at) / nearest, 2e-3) << x;
  }
}

// A ground without relief takes the same path as one with, to rounding.
TEST(Ground, ShapedGroundWithoutReliefIsThePlane) {
  for (const double slope : {0.0, 0.2}) {
    Ball plain(2, 0.02, 24000);
    plain.around.ground.normal = {-std::sin(slope), 0, std::cos(slope)};
    plain.around.ground.friction = 0.5;
    plain.around.ground.damping = 400;
    plain.state.position.z = 0.03;
    plain.state.velocity = {0.5, 0.1, 0};
    Ball shaped = plain;
    shaped.around.ground.plain = false;
    plain.go(0.3, 1e-3);
    shaped.go(0.3, 1e-3);
    EXPECT_NEAR(plain.state.position.x, shaped.state.position.x, 1e-12);
    EXPECT_NEAR(plain.state.position.z, shaped.state.position.z, 1e-12);
    EXPECT_NEAR(plain.state.rate.y, shaped.state.rate.y, 1e-10);
  }
}

/// Energy of a frictionless point that slides over waves on a soft spring.
double energy(const Ball& ball) {
  const auto& g = ball.around.ground;
  const auto& p = ball.state.position;
  const Rotation<double> level{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}};
  const Below<double> below = below_of(g, level, p);
  const ShapedFooting<double> on{g, below, stand_of(g, level, p), 1e-3};
  const double depth = std::max(0.0, lie_of(on, V3{0, 0, 0}, 0.0).depth);
  return 0.5 * ball.tree.trunk.mass * dot(ball.state.velocity, ball.state.velocity) +
         ball.tree.trunk.mass * ball.tree.gravity * p.z + 0.5 * g.stiffness * depth * depth;
}

// Source: conservation of energy. The step is implicit in the spring, so a hopping point loses energy, in
// first order of the step; at no step size does it win any.
TEST(Ground, SlidingWithoutFrictionOverWavesWinsNoEnergy) {
  double lost[2] = {0, 0};
  for (int k = 0; k < 2; ++k) {
    Ball ball(1, 0, 20000);
    ball.around.ground = waves(0.02, 0.7);
    ball.around.ground.stiffness = 20000;
    ball.around.ground.damping = 0;
    ball.around.ground.friction = 0;
    ball.state.position = {0.3, 0, 0.03};
    ball.state.velocity = {0.8, 0, 0};
    const double before = energy(ball);
    ball.go(0.6, k == 0 ? 4e-5 : 1e-5);
    EXPECT_GT(ball.state.position.x, 0.5);
    lost[k] = before - energy(ball);
    EXPECT_GT(lost[k], 0);
  }
  EXPECT_LT(lost[1], 0.35 * lost[0]);  // a quarter for first order
}

// Source: a ball that rolls without slipping in a trough of radius r swings with w^2 = 5/7 g / (r - R) for
// small swings (Lagrange); r = 1 / (amplitude wave_number^2) at the bottom of a sine.
TEST(Ground, ABallSwingsInATrough) {
  const double radius = 0.02;
  Ball ball(1, radius, 1e6);
  ball.around.ground = waves(0.1, 0.7);
  ball.around.ground.stiffness = 1e6;
  ball.around.ground.damping = 2000;
  ball.around.ground.stick_speed = 1e-4;
  const double k = 2 * kPi / 0.7;
  const double bottom = 0.75 * 0.7;
  ball.state.position = {bottom + 0.005, 0, -0.05 + radius};
  const double dt = 2e-5;
  double crossed[2] = {0, 0};
  int count = 0;
  double before = 1;
  for (int n = 0; count < 2 && n < 200000; ++n) {
    ball.step(dt);
    const double off = ball.state.position.x - bottom;
    if (before > 0 && off <= 0) crossed[count++] = n * dt;
    before = off;
  }
  ASSERT_EQ(count, 2);
  const double path = 1 / (0.05 * k * k) - radius;
  EXPECT_NEAR(crossed[1] - crossed[0], 2 * kPi * std::sqrt(1.4 * path / 9.81), 0.02);
}

Ball sliding(double slope, double speed) {
  Ball ball(1, 0, 24000);
  Site site;
  site.slope_rad = slope;
  site.friction = 0.3;
  ball.around.ground = ground_of(site);
  ball.state.position = ball.around.ground.normal * (-9.81 * std::cos(slope) / 24000);
  ball.state.velocity = lane_of(ball.around.ground) * speed;
  return ball;
}

// Source: Coulomb: between the angles of sliding and of sticking friction a body at rest stays (but for the
// creep of the regularised law), one that slides goes on.
TEST(Ground, AStickPeakHoldsWhatSlidingFrictionWouldNot) {
  const double slope = std::atan(0.36);
  for (const double push : {0.0, -1.0}) {
    Ball ball = sliding(slope, push);
    ball.around.ground.plain = false;
    ball.around.ground.peak = 0.5;  // 0.45 at rest
    ball.go(4, 1e-3);
    const double speed = dot(ball.state.velocity, lane_of(ball.around.ground));
    if (push == 0) {
      EXPECT_NEAR(speed, -0.02 * 0.36 / 0.45, 2e-3);
    } else {
      // Faster than at the begin: tan 0.36 > 0.3 (1 + 0.5 / (1 + 96)).
      EXPECT_LT(speed, -1.5);
    }
  }
}

// Source: dv/dt = mu(v) g with mu(v) = mu (1 - f min(v / 0.3, 1)); from 1 m/s to 0.3 in closed form.
TEST(Ground, FrictionThatFallsWithSlidingSpeedBrakesLess) {
  Ball ball = sliding(0, 1);
  ball.around.ground.plain = false;
  ball.around.ground.fading = 0.3;
  double time = 0;
  ball.go(0.05, 1e-4);  // the grip settles
  const double from = ball.state.velocity.x;
  while (ball.state.velocity.x > 0.3) {
    ball.step(1e-4);
    time += 1e-4;
  }
  EXPECT_NEAR(time, (from - 0.3) / (0.3 * 0.7 * 9.81), 2e-3);
}

// Source: no pyramid: a friction cone brakes equally in every direction.
TEST(Ground, FrictionIsACone) {
  double distance[2] = {0, 0};
  for (int k = 0; k < 2; ++k) {
    Ball ball = sliding(0, 0);
    ball.state.velocity = k == 0 ? V3{1, 0, 0} : V3{std::sqrt(0.5), std::sqrt(0.5), 0};
    ball.go(0.5, 1e-4);
    distance[k] = std::hypot(ball.state.position.x, ball.state.position.y);
  }
  EXPECT_NEAR(distance[0], distance[1], 1e-9);
  // 1 / (2 mu g) (checks: 0.1698946653 m) and what the regularised end creeps.
  EXPECT_NEAR(distance[0], 0.1698946653, 2e-3);
}

TEST(Ground, APatchHasItsOwnFriction) {
  Ball ball = sliding(0, 1);
  Site site;
  site.friction = 0.05;
  site.ground.patch_count = 1;
  site.ground.patch[0] = {0.3, 0.6, -0.5, 0.5, 1.0};
  ball.around.ground = ground_of(site);
  Ball beside = ball;
  beside.state.position.y = 0.7;
  ball.go(1, 1e-3);
  beside.go(1, 1e-3);
  EXPECT_GT(ball.state.position.x, 0.3);
  EXPECT_LT(ball.state.position.x, 0.3 + 1.0 / (2 * 9.81) + 0.01);
  EXPECT_GT(beside.state.position.x, 0.7);
}

// Source: e solves a v (1 + e) = ln((1 + a v) / (1 - a e v)), independent of mass and stiffness
// (Interpretation of the coefficient of restitution as damping in vibroimpact, J. Applied Mechanics 42
// (1975); values evaluated from the closed form). Without gravity.
TEST(Ground, RestitutionFallsWithImpactSpeedAsTheDampingByDepthSays) {
  const double expected[5][2] = {
      {0.1, 0.9374755799}, {0.2, 0.8821899862}, {0.5, 0.7484349316}, {1, 0.5936242600}, {2, 0.4107196861}};
  for (const auto& [speed, e] : expected) {
    for (const double stiffness : {1e4, 4e5}) {
      Ball ball(1, 0, stiffness);
      ball.tree.gravity = 0;
      ball.around.ground = Ground<double>{};
      ball.around.ground.stiffness = stiffness;
      ball.around.ground.damping = 0;
      ball.around.ground.bounce = 1;
      ball.around.ground.plain = false;
      ball.state.velocity = {0, 0, -speed};
      const double dt = 2e-5 * std::sqrt(1 / stiffness);
      ball.state.position.z = -1e-12;
      ball.step(dt);
      while (ball.state.position.z < 0) ball.step(dt);
      EXPECT_NEAR(ball.state.velocity.z / speed, e, 1e-4) << speed << " m/s on " << stiffness;
    }
  }
}

// --- The robot on it. ---

class OnGround : public ::testing::TestWithParam<const char*> {
 protected:
  files::RobotFile file_ = robot_file(GetParam());
  std::shared_ptr<const Model> model_ = model_of(file_);
};

const char* const kRough =
    "ground_wave_height_m: 0.012 ground_wave_length_m: 0.7 ground_steps { at_m: 0.1 height_m: 0.02 } "
    "ground_patches { from_m: 0.1 to_m: 9 right_m: 0 friction: 0.3 } friction_stick_ratio: 1.2 "
    "friction_fall: 0.15 ground_damping_rise_s_per_m: 0.5 slope_rad: 0.05";

TEST_P(OnGround, LegsSideBySideAgreeWithTheGeneralFormThere) {
  const Site site = site_from(kRough, file_, *model_);
  SimulatedRobot robot(model_, site, 1);
  robot.place_standing(1);
  SiteFigures<double> figures = figures_of(*model_, site);
  figures.pack.open_scale = 44;
  EXPECT_FALSE(figures.around.ground.plain);
  Stepper stepper(model_->figures());
  stepper.take_site(figures);
  Holder holder(file_.robot());
  for (int k = 0; k < 30; ++k) {
    holder.trot(robot, 0.02, 0.2, 0.05);
    RobotState<double> fitted = robot.state();
    RobotState<double> plain = robot.state();
    RobotWork<double> work{};
    stepper.step(figures, {}, 1e-3, fitted, work);
    step_plainly(model_->figures(), figures, {}, 1e-3, plain, work);
    EXPECT_NEAR(fitted.body.velocity.x, plain.body.velocity.x, 1e-12);
    EXPECT_NEAR(fitted.body.velocity.z, plain.body.velocity.z, 1e-12);
    EXPECT_NEAR(fitted.body.rate.y, plain.body.rate.y, 1e-10);
    for (std::size_t l = 0; l < 4; ++l)
      EXPECT_NEAR(fitted.body.grip.leg[l][0], plain.body.grip.leg[l][0], 1e-8);
  }
}

TEST_P(OnGround, ARobotIsPutDownOnWhateverLiesThere) {
  for (const char* text : {"", "ground_steps { at_m: 0 height_m: 0.04 }",
                           "ground_steps { at_m: -1 height_m: 0.3 } slope_rad: 0.1",
                           "ground_wave_height_m: 0.05 ground_wave_length_m: 0.9",
                           "ground_steps { at_m: -0.1 height_m: -0.05 }"}) {
    SimulatedRobot robot(model_, site_from(text, file_, *model_), 1);
    robot.place_standing(1);
    double hardest = 0;
    Holder holder(file_.robot());
    for (int k = 0; k < 1500; ++k) {
      holder.tick(robot);
      for (const auto& leg : robot.state().body.grip.leg) hardest = std::max(hardest, leg[0]);
    }
    EXPECT_FALSE(robot.fallen()) << text;
    EXPECT_LT(hardest, 4 * model_->mass_kg() * 9.81) << text;
    double held = 0;
    for (const auto& leg : robot.state().body.grip.leg) held += leg[0];
    EXPECT_NEAR(held, model_->mass_kg() * 9.81, 0.15 * model_->mass_kg() * 9.81) << text;
    EXPECT_NEAR(robot.truth().height_m, model_->stance_height_m(), 0.06) << text;
  }
}

INSTANTIATE_TEST_SUITE_P(Shipped, OnGround, ::testing::Values("dunlin12", "dunlin8"));

}  // namespace
}  // namespace pastern::stub
