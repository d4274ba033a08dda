// The plug-in through its C table, as a program that knows nothing of it would load it: stepped pace.
#include <dlfcn.h>
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <string>
#include <vector>

#include "proto/files/robot_file.h"
#include "runtime/hal/pastern_hal.h"

namespace pastern::stub {
namespace {

const std::string kRobot = PASTERN_SOURCE_DIR "/hal_stub/robots/dunlin12.robot.txtpb";

std::string scenario(const std::string& name) {
  return "scenario=" PASTERN_SOURCE_DIR "/hal_stub/scenarios/" + name + ".scenario.txtpb";
}

class Plugin : public ::testing::Test {
 protected:
  void SetUp() override {
    library_ = dlopen(PASTERN_BINARY_DIR "/lib/libpastern_hal_stub.so", RTLD_NOW | RTLD_LOCAL);
    ASSERT_NE(library_, nullptr) << dlerror();
    entry_ = reinterpret_cast<pastern_hal_entry_fn>(dlsym(library_, "pastern_hal_entry"));
    ASSERT_NE(entry_, nullptr);
    table_ = entry_(PASTERN_HAL_VERSION);
    ASSERT_NE(table_, nullptr);
    files::Defects defects;
    const auto robot = files::read_robot(kRobot, defects);
    ASSERT_TRUE(robot) << files::lines(defects);
    robot_ = robot->robot();
    for (const auto& joint : robot_.joints()) names_.push_back(joint.name().c_str());
  }
  void TearDown() override {
    for (void* handle : handles_) table_->close(handle);
    if (library_ != nullptr) dlclose(library_);
  }

  pastern_hal_config config(const std::string& options) {
    options_ = options;
    pastern_hal_config c{};
    c.struct_size = sizeof c;
    c.joint_count = static_cast<std::uint32_t>(names_.size());
    c.joint_names = names_.data();
    c.period_s = 0.001;
    c.drive_timeout_s = 0.02;
    c.robot_file = kRobot.c_str();
    c.options = options_.c_str();
    c.seed = 7;
    c.stepped = 1;
    return c;
  }

  void* open(const pastern_hal_config& c) {
    char error[400] = "";
    void* handle = table_->open(&c, error, sizeof error);
    error_ = error;
    if (handle != nullptr) handles_.push_back(handle);
    return handle;
  }

  static pastern_hal_frame read(const pastern_hal* table, void* handle) {
    pastern_hal_frame frame{};
    frame.struct_size = sizeof frame;
    EXPECT_EQ(table->read(handle, &frame), PASTERN_HAL_OK);
    return frame;
  }

  /// PD from where the joints are to the stance within a second, then held, as a cycle would.
  pastern_hal_frame rise(void* handle, int ticks) {
    pastern_hal_frame frame = read(table_, handle);
    const std::vector<double> from(frame.angle_rad, frame.angle_rad + names_.size());
    for (int k = 0; k < ticks; ++k) {
      const double s = std::min(1.0, k / 1000.0);
      pastern_hal_command command{};
      command.struct_size = sizeof command;
      command.joint_count = static_cast<std::uint32_t>(names_.size());
      command.torque_on = 1;
      for (int j = 0; j < robot_.joints_size(); ++j) {
        const auto& joint = robot_.joints(j);
        const double target =
            from[static_cast<std::size_t>(j)] + s * (joint.stance_rad() - from[static_cast<std::size_t>(j)]);
        const double peak = joint.guard().peak_torque_nm();
        command.torque_nm[j] = std::clamp(joint.stiffness_nm_per_rad() * (target - frame.angle_rad[j]) -
                                              joint.damping_nm_s_per_rad() * frame.speed_rad_s[j],
                                          -peak, peak);
      }
      EXPECT_EQ(table_->write(handle, &command), PASTERN_HAL_OK);
      frame = read(table_, handle);
    }
    return frame;
  }

  std::string saved(void* handle) {
    std::size_t length = 0;
    EXPECT_EQ(table_->save(handle, nullptr, 0, &length), PASTERN_HAL_FAILED);
    std::string bytes(length, 0);
    EXPECT_EQ(table_->save(handle, bytes.data(), bytes.size(), &length), PASTERN_HAL_OK);
    return bytes;
  }

  void* library_{nullptr};
  pastern_hal_entry_fn entry_{nullptr};
  const pastern_hal* table_{nullptr};
  v1::Robot robot_;
  std::vector<const char*> names_;
  std::string options_;
  std::string error_;
  std::vector<void*> handles_;
};

TEST_F(Plugin, ServesItsVersionOnlyAndSaysThatItIsSimulated) {
  EXPECT_EQ(entry_(PASTERN_HAL_VERSION + 1), nullptr);
  EXPECT_EQ(entry_(0), nullptr);
  EXPECT_EQ(table_->version, PASTERN_HAL_VERSION);
  EXPECT_EQ(table_->struct_size, sizeof(pastern_hal));
  EXPECT_EQ(table_->simulated, 1);
}

TEST_F(Plugin, TellsAFrameBeforeTheFirstCommandAndNoneTwice) {
  void* handle = open(config(""));
  ASSERT_NE(handle, nullptr) << error_;
  const auto frame = read(table_, handle);
  EXPECT_EQ(frame.joint_count, 12U);
  EXPECT_NEAR(frame.acceleration_m_s2[2], 9.80665, 1.5);
  pastern_hal_frame again{};
  again.struct_size = sizeof again;
  again.counter = 99;
  EXPECT_EQ(table_->read(handle, &again), PASTERN_HAL_NO_FRAME);
  EXPECT_EQ(again.counter, 99U);
}

TEST_F(Plugin, RobotRisesFromWhereItLiesAtEverySite) {
  for (const char* name :
       {"good_day", "cold_store", "worn_knee", "late_bus", "wet_ramp", "half_wrong", "wholly_wrong"}) {
    void* handle = open(config(scenario(name)));
    ASSERT_NE(handle, nullptr) << error_;
    ASSERT_EQ(table_->carry_back(handle, 11), PASTERN_HAL_OK);
    const auto frame = rise(handle, 1800);
    for (int j = 0; j < 12; ++j)
      EXPECT_NEAR(frame.angle_rad[j], robot_.joints(j).stance_rad(), 0.16) << name << j;
    EXPECT_NEAR(frame.acceleration_m_s2[2], 9.8, 1.0) << name;
  }
}

TEST_F(Plugin, ARestoredRobotGoesOnWithTheSameBits) {
  void* first = open(config(scenario("late_bus")));
  ASSERT_NE(first, nullptr) << error_;
  rise(first, 700);
  const std::string state = saved(first);
  void* second = open(config(scenario("late_bus")));
  ASSERT_EQ(table_->restore(second, state.data(), state.size()), PASTERN_HAL_OK)
      << table_->error_text(second);
  EXPECT_EQ(saved(second), state);
  for (void* handle : {first, second}) {
    ASSERT_EQ(table_->carry_back(handle, 5), PASTERN_HAL_OK);
    rise(handle, 900);
  }
  EXPECT_EQ(saved(first), saved(second));
}

TEST_F(Plugin, RefusesADamagedStateAndStaysAsItWas) {
  void* handle = open(config(""));
  ASSERT_NE(handle, nullptr) << error_;
  rise(handle, 50);
  const std::string state = saved(handle);
  for (const std::size_t at :
       {std::size_t{0}, std::size_t{9}, std::size_t{45}, state.size() / 2, state.size() - 1}) {
    std::string damaged = state;
    damaged[at] = static_cast<char>(damaged[at] ^ 1);
    EXPECT_EQ(table_->restore(handle, damaged.data(), damaged.size()), PASTERN_HAL_FAILED) << at;
    EXPECT_NE(std::string(table_->error_text(handle)), "");
  }
  EXPECT_EQ(table_->restore(handle, state.data(), state.size() / 2), PASTERN_HAL_FAILED);
  EXPECT_EQ(table_->restore(handle, state.data(), 0), PASTERN_HAL_FAILED);
  EXPECT_EQ(saved(handle), state);
}

TEST_F(Plugin, RefusesEveryWrongOpeningWithOneLine) {
  auto refused = [&](const pastern_hal_config& c, const std::string& part) {
    EXPECT_EQ(open(c), nullptr) << part;
    EXPECT_NE(error_.find(part), std::string::npos) << error_;
    EXPECT_EQ(error_.find('\n'), std::string::npos) << error_;
  };
  refused(config("scenario=/no/such/file"), "/no/such/file");
  refused(config("colour=red"), "colour");
  refused(config("scenario"), "key=value");
  refused(config("pace=wall"), "pace");
  refused(config("scenario=a;scenario=b"), "twice");
  auto c = config("");
  c.joint_count = 11;
  refused(c, "joint_count");
  c = config("");
  c.period_s = 0.002;
  refused(c, "period_s");
  c = config("");
  c.robot_file = "/no/robot";
  refused(c, "/no/robot");
  c = config("");
  std::swap(names_[0], names_[1]);
  refused(c, "joint_names[0]");
  std::swap(names_[0], names_[1]);
  c = config("");
  c.struct_size = 8;
  refused(c, "struct_size");
  c = config("");
  c.stepped = 0;
  refused(c, "socket");
  c = config("socket=/no/such/socket");
  c.stepped = 0;
  refused(c, "pastern-stub-robot");
}

TEST_F(Plugin, TellsForTheRecordWhichSiteWasDrawnAndNothingElse) {
  const std::string ranges = testing::TempDir() + "/pastern_ranges.scenario.txtpb";
  std::ofstream(ranges) << "name: \"ranges\" drawn { field: \"friction\" low: 0.3 high: 0.9 }\n";
  void* drawn = open(config("scenario=" + ranges));
  ASSERT_NE(drawn, nullptr) << error_;
  const std::string told = table_->about(drawn);
  EXPECT_EQ(told.find("site drawn by seed 7: name: \"ranges\" friction: 0."), 0U) << told;
  EXPECT_EQ(told.find("drawn {"), std::string::npos);
  EXPECT_EQ(told.find('\n'), std::string::npos);
  void* again = open(config("scenario=" + ranges));
  ASSERT_NE(again, nullptr) << error_;
  EXPECT_EQ(table_->about(again), told);
  auto other = config("scenario=" + ranges);
  other.seed = 8;
  EXPECT_NE(table_->about(open(other)), told);
  void* nominal = open(config(""));
  ASSERT_NE(nominal, nullptr) << error_;
  EXPECT_STREQ(table_->about(nominal), "");
}

}  // namespace
}  // namespace pastern::stub
