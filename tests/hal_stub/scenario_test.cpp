// Every field of the scenario file has an effect that can be seen, and no fault goes unseen.
#include <gtest/gtest.h>

#include <functional>
#include <map>
#include <set>

#include "tests/hal_stub/field.h"

namespace pastern::stub {
namespace {

TEST_F(Field, LoadWeighsOnTheFeet) {
  const auto weight = [&](const std::string& text) {
    double sum = 0;
    const SimulatedRobot made = stood(text, 4);
    for (const auto& leg : made.state().body.grip.leg) sum += leg[0];
    return sum;
  };
  EXPECT_NEAR(weight("load_kg: 3") - weight(""), 3 * 9.80665, 1.5);
}

TEST_F(Field, PlaceOfTheLoadLeansTheRobotThere) {
  const double left = stood("load_kg: 3 load_at_m { x: 0 y: 0.1 z: 0.1 }").truth().roll_rad;
  const double right = stood("load_kg: 3 load_at_m { x: 0 y: -0.1 z: 0.1 }").truth().roll_rad;
  EXPECT_LT(left, -0.005);  // left side down
  EXPECT_GT(right, 0.005);
  EXPECT_GT(stood("load_kg: 3 load_at_m { x: 0.15 y: 0 z: 0 }").truth().pitch_rad,
            stood("load_kg: 3 load_at_m { x: -0.15 y: 0 z: 0 }").truth().pitch_rad);
}

TEST_F(Field, HeightOfTheLoadChangesTheTrunksInertia) {
  const double low = trotted("load_kg: 3 load_at_m { x: 0 y: 0 z: 0 }").truth().position_m[0];
  const double high = trotted("load_kg: 3 load_at_m { x: 0 y: 0 z: 0.3 }").truth().position_m[0];
  EXPECT_GT(std::fabs(low - high), 1e-3);
}

TEST_F(Field, PackVoltageIsAsSaidAtRest) {
  auto low = robot("pack_voltage_ratio: 0.74");
  EXPECT_NEAR(low.state().pack.voltage, 0.74 * 44.4, 1e-9);
  auto full = robot("");
  const auto reach = [&](SimulatedRobot& r) {  // free legs, full torque: how fast a hip gets
    r.place_standing(1);
    r.state().body.position.z = 3;
    safety::Torques<> torque;
    torque[1] = 34;
    for (int k = 0; k < 60; ++k) {
      r.command(torque, true);
      r.step();
    }
    return r.state().body.speed[0][1];
  };
  EXPECT_LT(reach(low), 0.9 * reach(full));
}

TEST_F(Field, PackResistanceMakesTheVoltageSagMore) {
  EXPECT_LT(trotted("pack_resistance_ratio: 5").state().pack.voltage, trotted("").state().pack.voltage - 0.1);
}

TEST_F(Field, JointDampingSlowsAFreeLeg) {
  const auto speed_left = [&](const std::string& text) {
    auto r = robot(text);
    r.place_standing(1);
    r.state().body.position.z = 3;
    for (int k = 0; k < 40; ++k) {
      if (k == 4) r.state().body.speed[0][2] = 6;
      r.command({}, false);
      r.step();
    }
    return r.state().body.speed[0][2];
  };
  const double nominal = speed_left("");
  EXPECT_LT(speed_left("joint_damping_ratio: 6"), nominal - 0.5);
  EXPECT_LT(speed_left("joint_damping_nm_s_per_rad: 0.6"), nominal - 0.5);
  EXPECT_LT(speed_left("joint_coulomb_nm: 3"), nominal - 0.5);
}

TEST_F(Field, FrictionDecidesWhetherARobotStaysOnASlope) {
  const auto slid = [&](const std::string& text) {
    SimulatedRobot made = stood(text, 3);
    const double before = made.truth().position_m[0];
    Holder(file_.robot()).run(made, 2);
    return before - made.truth().position_m[0];
  };
  EXPECT_LT(slid("slope_rad: 0.2 friction: 0.6"), 0.02);  // what is left is the creep of the regularised law
  EXPECT_GT(slid("slope_rad: 0.2 friction: 0.1"), 0.5);
}

TEST_F(Field, SlopeTiltsTheRobotNoseUp) {
  auto up = stood("slope_rad: 0.09");
  EXPECT_NEAR(up.truth().pitch_rad, -0.09, 0.03);
  EXPECT_GT(frame_of(up).acceleration.x, 0.4);
}

TEST_F(Field, CommandDelayIsWhatItSays) {
  for (const int ms : {0, 2, 9, 31}) {
    auto r = robot("command_delay_s: " + std::to_string(ms * 1e-3));
    r.place_lying(1);
    int ticks = 0;
    safety::Torques<> torque;
    torque[2] = 5;
    for (; r.torque_mode() != TorqueMode::on && ticks < 100; ++ticks) {
      r.command(torque, true);
      r.step();
    }
    EXPECT_EQ(ticks, ms + 1);
  }
}

TEST_F(Field, CommandJitterVariesTheDelay) {
  std::set<int> seen;
  auto r = robot("command_delay_s: 0.009 command_jitter_s: 0.008");
  for (std::uint64_t draw = 0; draw < 40; ++draw) {
    r.place_lying(draw);
    int ticks = 0;
    for (; r.torque_mode() != TorqueMode::on && ticks < 100; ++ticks) {
      r.command({}, true);
      r.step();
    }
    EXPECT_GE(ticks, 10);
    EXPECT_LE(ticks, 18);
    seen.insert(ticks);
  }
  EXPECT_GE(seen.size(), 3U);
}

TEST_F(Field, SensorDelayShowsThePast) {
  auto r = robot("sensor_delay_s: 0.006 sensor_noise_ratio: 0");
  r.place_standing(1);
  r.state().body.position.z = 3;
  safety::SensorFrame frame;
  std::vector<double> real;
  for (int k = 0; k < 40; ++k) {
    r.command({}, false);
    r.step();
    real.push_back(r.state().body.angle[0][2]);
    ASSERT_TRUE(r.read(frame));
    if (k < 6) continue;
    EXPECT_NEAR(frame.angle[2], real[static_cast<std::size_t>(k) - 6], 2.1e-4) << k;
  }
}

TEST_F(Field, GroundStiffnessAndDampingChangeTheLanding) {
  const auto sunk = [&](const std::string& text) {
    auto r = robot(text);
    r.place_standing(1);
    r.state().body.position.z += 0.05;
    double most = 0;
    Holder holder(file_.robot());
    for (int k = 0; k < 300; ++k) {
      holder.tick(r);
      for (const auto& leg : r.state().body.grip.leg) most = std::max(most, leg[0]);
    }
    return most;
  };
  const double nominal = sunk("");
  EXPECT_LT(sunk("ground_stiffness_n_per_m: 2000"), nominal * 0.95);
  EXPECT_GT(sunk("ground_damping_n_s_per_m: 3000"), nominal * 1.05);
}

// The ground's own closed forms are in ground_test.cpp; here each field is seen to reach the robot.
TEST_F(Field, WavesAndStepsTiltAndRaiseTheRobot) {
  // Front feet on a crest, rear feet in a trough: nose up by the wave's height over the distance of the feet.
  EXPECT_NEAR(stood("ground_wave_height_m: 0.04 ground_wave_length_m: 0.94").truth().pitch_rad,
              stood("").truth().pitch_rad - 0.04 / 0.47, 0.03);
  EXPECT_NEAR(stood("ground_wave_height_m: 0.04 ground_wave_length_m: 0.47").truth().pitch_rad,
              stood("").truth().pitch_rad, 0.03);
  EXPECT_NEAR(stood("ground_steps { at_m: -1 height_m: 0.1 }").truth().position_m[2],
              stood("").truth().position_m[2] + 0.1, 1e-3);
  EXPECT_LT(stood("ground_steps { at_m: 0 height_m: 0.05 }").truth().pitch_rad, -0.05);  // nose up
}

TEST_F(Field, APatchIsWhereItIs) {
  const auto slid = [&](const std::string& patch) {
    SimulatedRobot made = stood("slope_rad: 0.2 friction: 0.6 " + patch, 1);
    const double before = made.truth().position_m[0];
    Holder(file_.robot()).run(made, 2);
    return before - made.truth().position_m[0];
  };
  EXPECT_GT(slid("ground_patches { from_m: -5 to_m: 5 friction: 0.08 }"), 0.3);
  EXPECT_LT(slid("ground_patches { from_m: 1 to_m: 5 friction: 0.08 }"), 0.02);
  EXPECT_LT(slid("ground_patches { from_m: -5 to_m: 5 right_m: 1 left_m: 2 friction: 0.08 }"), 0.02);
}

TEST_F(Field, LawsOfFrictionChangeWhatHolds) {
  const auto slid = [&](const std::string& text) {
    SimulatedRobot made = stood("slope_rad: 0.2 " + text, 1);
    const double before = made.truth().position_m[0];
    Holder(file_.robot()).run(made, 2);
    return before - made.truth().position_m[0];
  };
  EXPECT_GT(slid("friction: 0.18"), 0.1);
  EXPECT_LT(slid("friction: 0.18 friction_stick_ratio: 2"), 0.1);  // creeps only
  EXPECT_GT(slid("friction: 0.18 friction_fall: 0.3"), slid("friction: 0.18") + 0.05);
  EXPECT_GT(slid("friction: 0.4 friction_stick_speed_m_per_s: 0.06"), 2 * slid("friction: 0.4"));
}

TEST_F(Field, DampingThatRisesWithTheDepthHardensTheLanding) {
  const auto hardest = [&](const std::string& text) {
    auto r = robot("ground_damping_n_s_per_m: 0 " + text);
    r.place_standing(1);
    r.state().body.position.z += 0.1;
    double most = 0;
    Holder holder(file_.robot());
    for (int k = 0; k < 300; ++k) {
      holder.tick(r);
      for (const auto& leg : r.state().body.grip.leg) most = std::max(most, leg[0]);
    }
    return most;
  };
  EXPECT_NE(hardest("ground_damping_rise_s_per_m: 2"), hardest(""));
  EXPECT_GT(std::fabs(hardest("ground_damping_rise_s_per_m: 2") / hardest("") - 1), 0.03);
}

TEST_F(Field, APushChangesTheSpeedOnceAWalkByTheStatedSpread) {
  double squares = 0;
  const int walks = 60;
  auto r = robot("push_m_per_s: 0.5");
  for (std::uint64_t draw = 0; draw < walks; ++draw) {
    r.place_standing(draw);
    r.state().body.position.z = 60;  // in the air nothing else moves it sideways
    for (int k = 0; k < 4700; ++k) {
      r.command({}, false);
      r.step();
      r.state().body.rate = {0, 0, 0};
      if (r.state().body.position.z < 20) r.state().body.position.z = 60;
    }
    const auto& v = r.state().body.velocity;
    squares += v.x * v.x + v.y * v.y;
  }
  EXPECT_NEAR(std::sqrt(squares / walks), 0.5, 0.15);  // three standard errors of 60 draws
}

TEST_F(Field, StartScatterSpreadsTheStartPose) {
  double squares = 0;
  int count = 0;
  auto r = robot("start_scatter_rad: 0.05");
  for (std::uint64_t draw = 0; draw < 50; ++draw) {
    r.place_standing(draw);
    for (std::size_t l = 0; l < 4; ++l) {
      const double off = r.state().body.angle[l][1] - 0.75;
      squares += off * off;
      ++count;
    }
  }
  EXPECT_NEAR(std::sqrt(squares / count), 0.05, 0.01);
}

TEST_F(Field, AmbientAndWindingStartSetTheHeat) {
  auto cold = robot("ambient_c: -18 winding_start_c: 60");
  EXPECT_EQ(cold.state().drives.winding[0], 60);
  for (int k = 0; k < 20000; ++k) cold.step();
  auto warm = robot("ambient_c: 40 winding_start_c: 60");
  for (int k = 0; k < 20000; ++k) warm.step();
  EXPECT_LT(cold.state().drives.housing[0], warm.state().drives.housing[0] - 1);
  EXPECT_EQ(robot("ambient_c: -18").state().drives.winding[0], -18);
}

TEST_F(Field, ImuTiltTurnsWhatTheImuFeels) {
  auto straight = stood("sensor_noise_ratio: 0");
  auto tilted = stood("sensor_noise_ratio: 0 imu_tilt_rad { x: 0.1 y: 0 z: 0 }");
  EXPECT_NEAR(frame_of(tilted).acceleration.y - frame_of(straight).acceleration.y, 9.8 * 0.0998, 0.1);
}

TEST_F(Field, PositionSourceTellsTheTrunksPlace) {
  auto without = stood("");
  EXPECT_FALSE(frame_of(without).has_position);
  auto with = trotted("position_source: true");
  const auto frame = frame_of(with);
  ASSERT_TRUE(frame.has_position);
  EXPECT_NEAR(frame.position.x, with.truth().position_m[0], 1e-9);
}

TEST_F(Field, SensorNoiseRatioScalesTheNoise) {
  const auto spread = [&](const std::string& text) {
    auto r = robot(text);
    double sum = 0;
    double squares = 0;
    safety::SensorFrame frame;
    for (int k = 0; k < 2000; ++k) {
      r.command({}, false);
      r.step();
      (void)r.read(frame);
      if (k < 1000) continue;
      sum += frame.speed[0];
      squares += frame.speed[0] * frame.speed[0];
    }
    return std::sqrt(squares / 1000 - sum * sum / 1e6);
  };
  const double one = spread("");
  EXPECT_NEAR(one, 0.04, 0.005);
  EXPECT_NEAR(spread("sensor_noise_ratio: 3") / one, 3, 0.3);
  EXPECT_LT(spread("sensor_noise_ratio: 0"), one / 5);
}

TEST_F(Field, WearOfAJointWeakensItMakesPlayAndShiftsItsZero) {
  auto weak = stood("wear { joint: \"rear_left_knee\" strength: 0.4 }");
  EXPECT_GT(std::fabs(weak.state().body.angle[2][2] + 1.5),
            std::fabs(weak.state().body.angle[3][2] + 1.5) + 0.02);
  auto loose = trotted("wear { joint: \"rear_left_knee\" backlash_rad: 0.04 }");
  double most = 0;
  Holder holder(file_.robot());
  for (int k = 0; k < 800; ++k) {
    holder.trot(loose, 0.001, 0.2, 0.06);
    most = std::max(most, std::fabs(loose.state().drives.rotor_angle[8] - loose.state().body.angle[2][2]));
  }
  EXPECT_GT(most, 0.015);
  auto shifted = stood("sensor_noise_ratio: 0 wear { joint: \"rear_left_knee\" zero_offset_rad: 0.1 }");
  EXPECT_NEAR(frame_of(shifted).angle[8] - shifted.state().body.angle[2][2], 0.1, 0.002);
}

// --- Ranges.

class Ranges : public Field {
 protected:
  v1::Scenario scenario(const std::string& text) {
    files::Defects defects;
    const auto read = files::parse_scenario("name: \"test\"\n" + text, "test", file_, defects);
    EXPECT_TRUE(read) << files::lines(defects);
    return read.value_or(v1::Scenario());
  }
  v1::Scenario drawn(const std::string& text, std::uint64_t seed) {
    return drawn_scenario(scenario(text), *model_, seed);
  }
};

TEST_F(Ranges, TheSameSeedDrawsTheSameSiteAnotherSeedAnother) {
  const std::string text =
      "drawn { field: \"friction\" low: 0.3 high: 1 } drawn { field: \"slope_rad\" low: -0.07 high: 0.07 }";
  EXPECT_EQ(drawn(text, 7).SerializeAsString(), drawn(text, 7).SerializeAsString());
  EXPECT_NE(drawn(text, 7).friction(), drawn(text, 8).friction());
  EXPECT_EQ(drawn(text, 7).drawn_size(), 0);
  // A range more at the end leaves what was drawn before as it was.
  EXPECT_EQ(drawn(text + " drawn { field: \"load_kg\" low: 0 high: 4 }", 7).friction(),
            drawn(text, 7).friction());
  const Site site = site_of(scenario(text), *model_, 7);
  EXPECT_EQ(site.friction, drawn(text, 7).friction());
  EXPECT_EQ(site.slope_rad, drawn(text, 7).slope_rad());
}

TEST_F(Ranges, NumbersAreUniformBetweenTheEndsAndIndependentOfOneAnother) {
  const std::string text =
      "drawn { field: \"friction\" low: 0.2 high: 1 } drawn { field: \"load_kg\" low: 0 high: 4 }"
      "drawn { field: \"load_at_m.y\" low: -0.1 high: 0.1 }";
  constexpr int kSeeds = 2000;
  double sum = 0;
  double squares = 0;
  double product = 0;
  for (int seed = 0; seed < kSeeds; ++seed) {
    const v1::Scenario site = drawn(text, static_cast<std::uint64_t>(seed));
    ASSERT_GE(site.friction(), 0.2);
    ASSERT_LE(site.friction(), 1);
    ASSERT_EQ(site.load_at_m().x(), 0);
    const double u = (site.friction() - 0.2) / 0.8;
    sum += u;
    squares += u * u;
    product += (u - 0.5) * (site.load_kg() / 4 - 0.5);
  }
  // Uniform: mean 1/2, mean square 1/3; standard errors .0065 and .0067; of the product of two .0019.
  EXPECT_NEAR(sum / kSeeds, 0.5, 0.03);
  EXPECT_NEAR(squares / kSeeds, 1.0 / 3, 0.03);
  EXPECT_NEAR(product / kSeeds, 0, 0.009);
}

TEST_F(Ranges, WearIsDrawnForEachJointForOneOfThemOrForTheJointNamed) {
  const v1::Scenario each = drawn("drawn { field: \"strength\" joint: \"each\" low: 0.8 high: 1 }", 3);
  ASSERT_EQ(each.wear_size(), 12);
  std::set<double> numbers;
  for (const auto& wear : each.wear()) numbers.insert(wear.strength());
  EXPECT_EQ(numbers.size(), 12U);
  std::set<std::string> weak;
  int worn = 0;
  for (std::uint64_t seed = 0; seed < 400; ++seed) {
    const v1::Scenario one =
        drawn("drawn { field: \"strength\" joint: \"one\" low: 0.4 high: 0.9 share: 0.6 }", seed);
    ASSERT_LE(one.wear_size(), 1);
    worn += one.wear_size();
    if (one.wear_size() == 1) weak.insert(one.wear(0).joint());
  }
  EXPECT_EQ(weak.size(), 12U);
  EXPECT_NEAR(worn, 240, 40);  // standard deviation 9.8
  const v1::Scenario named =
      drawn("drawn { field: \"backlash_rad\" joint: \"rear_left_knee\" low: 0.01 high: 0.02 }", 3);
  ASSERT_EQ(named.wear_size(), 1);
  EXPECT_EQ(named.wear(0).joint(), "rear_left_knee");
}

// --- Faults: each kind is asked for by its name, so a new kind without a test is seen by the last test here.
// ---

using Check = std::function<void(Field*)>;

class Faults : public Field {
 protected:
  /// A held robot, one tick before and some ticks into a fault that begins at 0.5 s and lasts 0.2 s.
  struct Seen {
    safety::SensorFrame before;
    safety::SensorFrame during;
    bool read_before{false};
    bool read_during{false};
    bool sound_during{true};
    TorqueMode mode{TorqueMode::off};
    RobotState<double> state;
    Truth truth;
    bool sound_after{false};
    safety::SensorFrame after;
  };
  Seen see(const std::string& kind, const std::string& more = "") {
    auto r =
        robot("sensor_noise_ratio: 0 faults { kind: " + kind + " begins_s: 0.5 lasts_s: 0.2 " + more + " }");
    r.place_standing(1);
    Holder holder(file_.robot());
    Seen seen;
    for (int k = 0; k < 750; ++k) {
      holder.tick(r);
      if (k == 498) seen.read_before = r.read(seen.before);
      if (k == 560) {
        seen.sound_during = r.bus_sound();
        seen.read_during = r.read(seen.during);
        seen.mode = r.torque_mode();
        seen.state = r.state();
        seen.truth = r.truth();
      }
    }
    seen.sound_after = r.bus_sound() && r.read(seen.after);
    return seen;
  }
};

TEST_F(Faults, EachKindHasItsEffectWhileItLasts) {
  const std::string knee = "joint: \"rear_left_knee\" ";
  std::map<std::string, std::function<void()>> checks;
  checks["ANGLE_STUCK"] = [&] {
    auto r = robot("faults { kind: ANGLE_STUCK " + knee + "begins_s: 0.1 lasts_s: 5 }");
    r.place_lying(1);
    safety::SensorFrame frame;
    std::set<double> seen;
    for (int k = 0; k < 500; ++k) {
      safety::Torques<> torque;
      torque[8] = 6 * std::sin(k * 0.05);
      (void)r.read(frame);
      r.command(torque, true);
      r.step();
      if (k > 110) seen.insert(frame.angle[8]);
    }
    EXPECT_EQ(seen.size(), 1U);
  };
  checks["ANGLE_NAN"] = [&] {
    const auto seen = see("ANGLE_NAN", knee);
    EXPECT_TRUE(std::isnan(seen.during.angle[8]));
    EXPECT_FALSE(std::isnan(seen.during.angle[7]));
    EXPECT_FALSE(std::isnan(seen.after.angle[8]));
  };
  checks["ANGLE_JUMP"] = [&] {
    const auto seen = see("ANGLE_JUMP", knee + "size: 0.5");
    EXPECT_GT(seen.during.angle[8] - seen.state.body.angle[2][2], 0.45);
  };
  checks["SPEED_NAN"] = [&] { EXPECT_TRUE(std::isnan(see("SPEED_NAN", knee).during.speed[8])); };
  checks["RATE_NAN"] = [&] { EXPECT_TRUE(std::isnan(see("RATE_NAN").during.rate.x)); };
  checks["ACCELERATION_NAN"] = [&] {
    EXPECT_TRUE(std::isnan(see("ACCELERATION_NAN").during.acceleration.z));
  };
  checks["FRAMES_LOST"] = [&] {
    const auto seen = see("FRAMES_LOST");
    EXPECT_TRUE(seen.read_before);
    EXPECT_FALSE(seen.read_during);
    EXPECT_TRUE(seen.sound_during);
    EXPECT_TRUE(seen.sound_after);
  };
  checks["FRAMES_FROZEN"] = [&] {
    auto r = robot("faults { kind: FRAMES_FROZEN begins_s: 0.1 lasts_s: 0.2 }");
    r.place_standing(1);
    std::set<double> seen;
    std::set<std::uint64_t> counters;
    Holder holder(file_.robot());
    for (int k = 0; k < 280; ++k) {
      holder.tick(r);
      if (k < 110) continue;
      seen.insert(holder.frame.rate.x);
      counters.insert(holder.frame.counter);
    }
    EXPECT_EQ(seen.size(), 1U);
    EXPECT_EQ(counters.size(), 170U);
  };
  checks["DRIVE_DEAD"] = [&] {
    const auto seen = see("DRIVE_DEAD", knee);
    EXPECT_EQ(seen.state.drives.torque[8], 0);
    EXPECT_NE(seen.state.drives.torque[11], 0);
  };
  checks["DRIVE_RUNAWAY"] = [&] {
    EXPECT_NEAR(see("DRIVE_RUNAWAY", knee + "size: -5").state.drives.torque[8], -5, 1e-9);
  };
  checks["PACK_CUT"] = [&] {
    const auto seen = see("PACK_CUT");
    EXPECT_EQ(seen.during.pack_voltage_v, 0);
    EXPECT_EQ(seen.state.drives.torque[11], 0);
    EXPECT_GT(seen.after.pack_voltage_v, 30);
  };
  checks["EMERGENCY_STOP"] = [&] {
    const auto seen = see("EMERGENCY_STOP");
    EXPECT_FALSE(seen.before.emergency_stop);
    EXPECT_TRUE(seen.during.emergency_stop);
    EXPECT_EQ(seen.mode, TorqueMode::off);
    for (std::size_t j = 0; j < 12; ++j) EXPECT_EQ(seen.state.drives.torque[j], 0);
    EXPECT_FALSE(seen.after.emergency_stop);
  };
  checks["BUS_BROKEN"] = [&] {
    const auto seen = see("BUS_BROKEN");
    EXPECT_FALSE(seen.sound_during);
    EXPECT_FALSE(seen.read_during);
    EXPECT_EQ(seen.mode, TorqueMode::damping) << "no command arrives: the drives time out by themselves";
    EXPECT_TRUE(seen.sound_after);
  };
  checks["WINDING_HOT"] = [&] {
    EXPECT_NEAR(see("WINDING_HOT", knee + "size: 130").during.winding[8], 130, 0.1);
  };
  checks["TORQUE_SENSE_HIGH"] = [&] {
    const auto seen = see("TORQUE_SENSE_HIGH", knee + "size: 70");
    EXPECT_NEAR(seen.during.torque[8] - seen.state.drives.torque[8], 70, 1e-9);
  };
  checks["PUSH"] = [&] {
    auto r = robot("faults { kind: PUSH begins_s: 0.05 lasts_s: 0.1 size: 0.7 }");
    r.place_standing(1);
    r.state().body.position.z = 20;
    for (int k = 0; k < 200; ++k) r.step();
    EXPECT_NEAR(r.state().body.velocity.y, 0.7, 0.1);
  };
  for (const auto& [kind, check] : checks) {
    SCOPED_TRACE(kind);
    check();
  }
  const auto* kinds = v1::Fault::Kind_descriptor();
  for (int i = 0; i < kinds->value_count(); ++i) {
    const std::string name(kinds->value(i)->name());
    if (name == "KIND_NOT_SAID") continue;
    EXPECT_EQ(checks.count(name), 1U) << name;
  }
}

}  // namespace
}  // namespace pastern::stub
