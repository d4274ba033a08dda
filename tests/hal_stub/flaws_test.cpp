// Fields of the scenario file and of the robot file that make a robot other than its file says: each has an
// effect that can be seen, is saved and restored, and is the same in the fitted step as in the plain one.
#include <gtest/gtest.h>

#include <functional>
#include <vector>

#include "hal_stub/robot/start.h"
#include "tests/hal_stub/field.h"

namespace pastern::stub {
namespace {

class Flaw : public Field {
 protected:
  /// In the air, drives off, the knee of the first leg told a torque.
  double knee_speed(const std::string& text, double torque, int ticks) {
    auto r = robot(text);
    r.place_standing(1);
    r.state().body.position.z = 3;
    safety::Torques<> told;
    told[2] = torque;
    for (int k = 0; k < ticks; ++k) {
      r.command(told, true);
      r.step();
    }
    return r.state().body.speed[0][2];
  }
  double weight(const std::string& text) {
    double sum = 0;
    const SimulatedRobot made = stood(text, 3);
    for (const auto& leg : made.state().body.grip.leg) sum += leg[0];
    return sum;
  }
  void change(const std::function<void(v1::Robot&)>& f) {
    v1::Robot changed = file_.robot();
    f(changed);
    std::string error;
    model_ = Model::make(changed, error);
    ASSERT_NE(model_, nullptr) << error;
  }
};

constexpr char kAll[] =
    "load_kg: 3 load_at_m { x: 0.05 y: 0.05 z: 0 } load_hangs_m: 0.15 load_swing_damping: 0.1 "
    "joint_backlash_rad: 0.006 joint_gear_loss: 0.1 joint_stick_nm: 0.2 shank_mass_ratio: 1.1 "
    "trunk_inertia_ratio: 1.2 pack_c: -10 imu_delay_s: 0.005 sensor_delay_s: 0.002 frames_late: 0.05 "
    "frames_late_s: 0.002 frames_repeated: 0.05 push_m_per_s: 0.1 "
    "wear { joint: \"front_left_hip\" link_mass_ratio: 1.2 }";

TEST_F(Flaw, ALoadThatHangsIsCarriedAndSwings) {
  const std::string hangs = "load_kg: 3 load_at_m { x: 0 y: 0 z: 0 } load_hangs_m: 0.15 ";
  EXPECT_NEAR(weight(hangs) - weight(""), 3 * 9.80665, 2);
  double far = 0;
  auto r = robot(hangs);
  r.place_standing(1);
  EXPECT_NEAR(r.state().body.swing.place.z, -0.15, 0.02);  // below its place, as the robot lies on the slope
  Holder holder(file_.robot());
  for (int k = 0; k < 1500; ++k) {
    holder.trot(r, 0.001, 0.2, 0.06);
    holder.tick(r);
    far = std::max(far, std::fabs(r.state().body.swing.place.x));
  }
  holder.trot(r, 2, 0.2, 0.06);
  const auto fixed = trotted("load_kg: 3 load_at_m { x: 0 y: 0 z: -0.15 }", 2);
  const auto hung = trotted(hangs, 2);
  EXPECT_GT(std::fabs(fixed.truth().position_m[0] - hung.truth().position_m[0]), 1e-4);
  EXPECT_GT(std::fabs(hung.state().body.swing.place.x) + far, 1e-3);
}

TEST_F(Flaw, ALoadHangsStillAgainWhenTheRobotIsPutBack) {
  auto r = trotted("load_kg: 3 load_at_m { x: 0 y: 0 z: 0 } load_hangs_m: 0.15", 1);
  r.place_standing(2);
  const auto& swing = r.state().body.swing;
  EXPECT_EQ(dot(swing.velocity, swing.velocity), 0);
  EXPECT_NEAR(swing.place.z, -0.15, 1e-12);
  EXPECT_NEAR(swing.place.x, 0, 1e-12);
}

TEST_F(Flaw, SwingDampingCalmsTheLoad) {
  const auto left = [&](const std::string& damping) {
    auto r =
        robot("load_kg: 1 load_at_m { x: 0 y: 0 z: 0 } load_hangs_m: 0.1 load_swing_damping: " + damping);
    r.place_standing(1);
    Holder holder(file_.robot());
    holder.run(r, 0.5);
    r.state().body.swing.velocity.y = 0.3;
    double most = 0;
    for (int k = 0; k < 4000; ++k) {
      holder.tick(r);
      if (k > 3000) most = std::max(most, std::fabs(r.state().body.swing.place.y));
    }
    return most;
  };
  EXPECT_LT(left("0.3"), 0.5 * left("0.0"));
}

TEST_F(Flaw, BacklashOfAllJointsOpensEveryGap) {
  auto r = trotted("joint_backlash_rad: 0.03 wear { joint: \"rear_left_knee\" backlash_rad: 0.01 }", 0.5);
  EXPECT_EQ(r.site().backlash_rad[8], 0.01);  // wear goes before
  std::array<double, 12> most{};
  Holder holder(file_.robot());
  for (int k = 0; k < 800; ++k) {
    holder.trot(r, 0.001, 0.2, 0.06);
    for (std::size_t j = 0; j < 12; ++j) {
      const double gap = std::fabs(r.state().drives.rotor_angle[j] - r.state().body.angle[j / 3][j % 3]);
      most[j] = std::max(most[j], gap);
    }
  }
  for (std::size_t j = 0; j < 12; ++j) {
    // Half the gap, and what the teeth give: at most the peak torque over 4 000 N m/rad.
    EXPECT_GT(most[j], j == 8 ? 0.003 : 0.006) << j;
    EXPECT_LT(most[j], (j == 8 ? 0.005 : 0.015) + 34.0 / 4000) << j;
  }
}

TEST_F(Flaw, GearLossTakesItsPartOfTheTorque) {
  const double whole = knee_speed("", 6, 20);
  EXPECT_LT(knee_speed("joint_gear_loss: 0.2", 6, 20), 0.9 * whole);
  EXPECT_GT(knee_speed("joint_gear_loss: 0.2", 6, 20), 0.6 * whole);
}

TEST_F(Flaw, AStickingJointStaysUntilItBreaksAway) {
  const auto moved = [&](double torque) {
    auto r = robot("joint_stick_nm: 4");
    r.place_standing(1);
    r.state().body.position.z = 1e3;  // falls freely: its own weight does not act on the joint
    safety::Torques<> told;
    told[2] = torque;
    for (int k = 0; k < 300; ++k) {
      r.command(told, true);
      r.step();
    }
    return std::fabs(r.state().body.angle[0][2] + 1.5);
  };
  EXPECT_LT(moved(2), 0.002);
  EXPECT_GT(moved(8), 0.05);
}

TEST_F(Flaw, HeavierShanksAndLinksWeighOnTheFeet) {
  double shanks = 0;
  for (const int j : model_->shanks()) shanks += file_.robot().joints(j).link().mass_kg();
  EXPECT_NEAR(weight("shank_mass_ratio: 1.5") - weight(""), 0.5 * shanks * 9.80665, 0.5);
  const double thigh = file_.robot().joints(1).link().mass_kg();
  EXPECT_NEAR(weight("wear { joint: \"front_left_hip\" link_mass_ratio: 2 }") - weight(""), thigh * 9.80665,
              0.5);
  EXPECT_LT(knee_speed("shank_mass_ratio: 2", 6, 20), 0.95 * knee_speed("", 6, 20));
}

TEST_F(Flaw, AWiderTrunkTurnsLessWhenTheLegsKick) {
  const auto turned = [&](const std::string& text) {
    auto r = robot(text);
    r.place_standing(1);
    r.state().body.position.z = 3;
    safety::Torques<> told;
    for (int l = 0; l < 4; ++l) told[3 * l + 1] = 10;
    for (int k = 0; k < 20; ++k) {
      r.command(told, true);
      r.step();
    }
    return std::fabs(r.state().body.rate.y);
  };
  EXPECT_LT(turned("trunk_inertia_ratio: 1.3"), 0.95 * turned(""));
}

TEST_F(Flaw, AColdPackSagsMore) {
  change([](v1::Robot& r) { r.mutable_pack()->set_resistance_cold_ratio(4); });
  const double warm = trotted("pack_c: 25", 1).state().pack.voltage;
  EXPECT_LT(trotted("pack_c: -20", 1).state().pack.voltage, warm - 0.1);
  EXPECT_EQ(trotted("ambient_c: -20 winding_start_c: 25", 1).site().pack_c, -20);
  EXPECT_EQ(trotted("ambient_c: -20 pack_c: 25", 0.1).site().pack_c, 25);
}

TEST_F(Flaw, TheImuIsLateByItselfAndTheEncodersAreNot) {
  auto now = robot("sensor_noise_ratio: 0");
  auto late = robot("sensor_noise_ratio: 0 imu_delay_s: 0.006");
  Holder a(file_.robot());
  Holder b(file_.robot());
  now.place_standing(1);
  late.place_standing(1);
  std::vector<double> rate;
  double spread = 0;
  for (std::size_t k = 0; k < 400; ++k) {
    a.trot(now, 0.001, 0.2, 0.06);
    b.trot(late, 0.001, 0.2, 0.06);
    rate.push_back(a.frame.rate.y);
    EXPECT_EQ(a.frame.angle[2], b.frame.angle[2]);
    if (k >= 6) {
      EXPECT_NEAR(b.frame.rate.y, rate[k - 6], 1e-12) << k;
    }
    spread = std::max(spread, std::fabs(a.frame.rate.y - b.frame.rate.y));
  }
  EXPECT_GT(spread, 0.01);
}

/// What a thousand ticks' reads gave.
struct Told {
  int none{0};
  int again{0};
  std::uint64_t most_age{0};
};
Told told_by(SimulatedRobot r, int ticks) {
  Told told;
  r.place_standing(7);
  safety::SensorFrame frame;
  (void)r.read(frame);
  const std::uint64_t first = frame.counter;
  for (int k = 1; k <= ticks; ++k) {
    r.command({}, false);
    r.step();
    const std::uint64_t before = frame.counter;
    if (!r.read(frame)) {
      ++told.none;
      EXPECT_EQ(frame.counter, before);
    } else if (frame.counter == before) {
      ++told.again;
    } else {
      EXPECT_GT(frame.counter, before);
    }
    told.most_age = std::max(told.most_age, first + static_cast<std::uint64_t>(k) - frame.counter);
    EXPECT_FALSE(r.read(frame)) << "twice in a tick";
  }
  return told;
}

TEST_F(Flaw, FramesComeLateAsOftenAndAsLongAsSaid) {
  const Told sound = told_by(robot(""), 2000);
  EXPECT_EQ(sound.none + sound.again, 0);
  const Told late = told_by(robot("frames_late: 0.1"), 4000);
  EXPECT_NEAR(late.none / 4000.0, 0.1, 0.02);  // four standard errors
  EXPECT_EQ(late.again, 0);
  EXPECT_GE(late.most_age, 1U);
  const Told later = told_by(robot("frames_late: 0.02 frames_late_s: 0.005"), 4000);
  EXPECT_GE(later.most_age, 5U);
  EXPECT_NEAR(later.none / 4000.0, 1 - std::pow(0.98, 5), 0.03);
}

TEST_F(Flaw, FramesAreToldAgainAsOftenAsSaid) {
  const Told told = told_by(robot("frames_repeated: 0.1"), 4000);
  EXPECT_EQ(told.none, 0);
  EXPECT_NEAR(told.again / 4000.0, 0.1, 0.02);
}

TEST_F(Flaw, LateFramesAreThoseOfTheSameSeedAndDraw) {
  const FrameFlaws flaws{0.1, 0.1, 3};
  int differ = 0;
  for (std::uint32_t tick = 0; tick < 500; ++tick) {
    EXPECT_EQ(news_of(flaws, 3, 4, tick).age, news_of(flaws, 3, 4, tick).age);
    EXPECT_LE(news_of(flaws, 3, 4, tick).age, std::min(tick, oldest_news(flaws)));
    differ += news_of(flaws, 3, 4, tick).age != news_of(flaws, 3, 5, tick).age ? 1 : 0;
  }
  EXPECT_GT(differ, 50);
}

TEST_F(Flaw, ADriveGivesNoMoreThanItsCurrentLimitAndLessWhenItIsHot) {
  change([](v1::Robot& r) {
    for (auto& joint : *r.mutable_joints()) {
      joint.mutable_drive()->set_current_limit_a(16 / joint.drive().torque_per_amp_nm());
      joint.mutable_drive()->set_derate_warm_c(90);
      joint.mutable_drive()->set_derate_hot_c(130);
    }
  });
  const auto made = [&](double winding) {
    auto r = robot("winding_start_c: " + std::to_string(winding));
    r.place_standing(1);
    safety::Torques<> told;
    told[2] = 30;
    double most = 0;
    for (int k = 0; k < 6; ++k) {
      r.command(told, true);
      r.step();
      most = std::max(most, r.state().drives.torque[2]);
    }
    return most;
  };
  EXPECT_NEAR(made(25), 16, 1e-9);
  EXPECT_NEAR(made(110), 8, 0.1);
  EXPECT_NEAR(made(140), 0, 1e-9);
}

TEST_F(Flaw, DeratingCarriesOverWhenTheRobotIsPutBack) {
  change([](v1::Robot& r) {
    r.mutable_joints(2)->mutable_drive()->set_derate_warm_c(30);
    r.mutable_joints(2)->mutable_drive()->set_derate_hot_c(80);
  });
  auto r = stood("winding_start_c: 60", 0.2);
  r.place_standing(2);
  EXPECT_GT(r.state().drives.winding[2], 55);
  safety::Torques<> told;
  told[2] = 30;
  for (int k = 0; k < 5; ++k) {
    r.command(told, true);
    r.step();
  }
  EXPECT_LT(r.state().drives.torque[2], 0.55 * model_->figures().drive[2].peak_torque);
}

TEST_F(Flaw, ThePacksCurrentLimitHoldsTheDrivesBack) {
  const auto most = [&](double amps) {
    change([amps](v1::Robot& r) { r.mutable_pack()->set_current_limit_a(amps); });
    auto r = trotted("load_kg: 4", 0.5);
    Holder holder(file_.robot());
    double least = 1;
    for (int k = 0; k < 500; ++k) {
      holder.trot(r, 0.001, 0.2, 0.06);
      least = std::min(least, r.state().pack.share);
    }
    return least;
  };
  EXPECT_EQ(most(1000), 1);
  EXPECT_LT(most(2), 0.98);
}

TEST_F(Flaw, RestoredGoesOnLikeOneNeverInterrupted) {
  change([](v1::Robot& r) {
    r.mutable_pack()->set_current_limit_a(12);
    r.mutable_joints(2)->mutable_drive()->set_derate_warm_c(30);
    r.mutable_joints(2)->mutable_drive()->set_derate_hot_c(120);
  });
  auto first = robot(kAll, 5);
  first.place_standing(3);
  Holder holder(file_.robot());
  holder.trot(first, 1.2, 0.2, 0.05);
  auto second = robot(kAll, 5);
  std::string error;
  ASSERT_TRUE(second.restore(first.save(), error)) << error;
  Holder other = holder;
  holder.trot(first, 1, 0.2, 0.05);
  other.trot(second, 1, 0.2, 0.05);
  EXPECT_EQ(first.save(), second.save());
  EXPECT_NE(first.state().body.swing.velocity.x, 0);
  EXPECT_NE(first.state().drives.wound[1], 0);
}

// A few units in the last place of the largest terms, which stiff contacts and straps magnify.
TEST_F(Flaw, TheFittedStepIsThePlainStepWithEveryFlaw) {
  auto r = robot(kAll);
  const SiteFigures<double> site = figures_of(*model_, r.site());
  SiteFigures<double> now = site;
  now.pack.open_scale = 44;
  Stepper stepper(model_->figures());
  stepper.take_site(now);
  stub::Told<double> told{};
  for (std::size_t j = 0; j < kMaxJoints; ++j) told.wanted[j] = 3 * std::sin(static_cast<double>(j));
  r.place_standing(1);
  Holder holder(file_.robot());
  for (int k = 0; k < 40; ++k) {
    holder.trot(r, 0.02, 0.2, 0.05);
    RobotState<double> fitted = r.state();
    RobotState<double> plain = r.state();
    RobotWork<double> work{};
    stepper.step(now, told, 1e-3, fitted, work);
    step_plainly(model_->figures(), now, told, 1e-3, plain, work);
    EXPECT_NEAR(fitted.body.velocity.x, plain.body.velocity.x, 1e-10);
    EXPECT_NEAR(fitted.body.swing.velocity.y, plain.body.swing.velocity.y, 1e-9);
    EXPECT_NEAR(fitted.body.rate.y, plain.body.rate.y, 1e-9);
    EXPECT_NEAR(fitted.pack.share, plain.pack.share, 1e-10);
    for (std::size_t j = 0; j < 12; ++j) {
      EXPECT_NEAR(fitted.drives.rotor_speed[j], plain.drives.rotor_speed[j], 1e-8);
      EXPECT_NEAR(fitted.drives.wound[j], plain.drives.wound[j], 1e-8);
      EXPECT_NEAR(fitted.body.speed[j / 3][j % 3], plain.body.speed[j / 3][j % 3], 1e-8);
    }
  }
}

// Every flaw at the value at which it is none: the long form gives what the short one gives.
TEST_F(Flaw, FlawsOfNoSizeChangeNothing) {
  const auto place = [&](const std::string& text) { return trotted(text, 1).truth().position_m[0]; };
  EXPECT_EQ(place("joint_gear_loss: 0 joint_stick_nm: 0 shank_mass_ratio: 1 trunk_inertia_ratio: 1 "
                  "frames_late: 0 frames_repeated: 0 pack_c: 20 joint_backlash_rad: 0"),
            place(""));
}

}  // namespace
}  // namespace pastern::stub
