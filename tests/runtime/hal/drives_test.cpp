// The loader of drives against plug-ins that are sound (recorded frames played back) and damaged.
#include "runtime/hal/drives.h"

#include <gtest/gtest.h>
#include <unistd.h>

#include <array>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <limits>
#include <sstream>
#include <vector>

#include "tests/safety/fixture.h"

namespace pastern::hal {
namespace {

namespace fs = std::filesystem;

class Folder {
 public:
  Folder() {
    std::string pattern = (fs::temp_directory_path() / "pastern_hal_XXXXXX").string();
    path_ = mkdtemp(pattern.data());
  }
  ~Folder() { fs::remove_all(path_); }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  [[nodiscard]] std::string file(const std::string& name) const { return (path_ / name).string(); }

 private:
  fs::path path_;
};

std::string plugin(const std::string& name) { return std::string(PLUGIN_FOLDER) + "/" + name + ".so"; }

DrivesConfig playback_config(const Folder& folder, const std::string& recording) {
  std::ofstream(folder.file("frames.txt")) << recording;
  DrivesConfig config;
  config.plugin = plugin("playback_hal");
  config.joint_names = {"left", "right"};
  config.options = "frames=" + folder.file("frames.txt") + ";commands=" + folder.file("commands.txt");
  return config;
}

std::string open_error(DrivesConfig config) {
  std::string error;
  EXPECT_EQ(Drives::open(config, error), nullptr);
  EXPECT_EQ(error.find('\n'), std::string::npos) << error;
  return error;
}

std::string damaged_error(int damage) {
  DrivesConfig config;
  config.plugin = plugin("damaged_hal_" + std::to_string(damage));
  config.joint_names = {"left", "right"};
  return open_error(config);
}

std::unique_ptr<Drives> open_damaged(int damage) {
  DrivesConfig config;
  config.plugin = plugin("damaged_hal_" + std::to_string(damage));
  config.joint_names = {"left", "right"};
  std::string error;
  std::unique_ptr<Drives> drives = Drives::open(config, error);
  EXPECT_NE(drives, nullptr) << error;
  return drives;
}

constexpr const char* kRecording =
    "frame 7 1000000 0.1 -0.2  1.5 -2.5  3.25 -4.5  31 32  0.01 0.02 0.03  0.5 -0.25 9.81  44.5 1.25 0\n"
    "nothing\n"
    "frame 8 2000000 0.11 -0.21  1.6 -2.6  3.5 -4.75  31.5 32.5  0.04 0.05 0.06  0.5 -0.5 9.75  44.25 1.5 1\n"
    "broken bus 2: checksum\n";

TEST(Drives, PlaysBackARecordingFieldByField) {
  const Folder folder;
  std::string error;
  const auto drives = Drives::open(playback_config(folder, kRecording), error);
  ASSERT_NE(drives, nullptr) << error;
  EXPECT_EQ(drives->name(), "playback");
  EXPECT_EQ(drives->about(), "frames of a recorded walk");  // two lines of the plug-in's own made one
  EXPECT_FALSE(drives->simulated());

  safety::SensorFrame frame;
  ASSERT_EQ(drives->read(frame), ReadResult::fresh);
  EXPECT_EQ(frame.counter, 7u);
  EXPECT_EQ(frame.time.value, 1000000);
  EXPECT_EQ(frame.joint_count, 2);
  EXPECT_EQ(frame.angle[0], 0.1);
  EXPECT_EQ(frame.angle[1], -0.2);
  EXPECT_EQ(frame.speed[0], 1.5);
  EXPECT_EQ(frame.speed[1], -2.5);
  EXPECT_EQ(frame.torque[0], 3.25);
  EXPECT_EQ(frame.torque[1], -4.5);
  EXPECT_EQ(frame.winding[1], 32.0);
  EXPECT_EQ(frame.rate.z, 0.03);
  EXPECT_EQ(frame.acceleration.y, -0.25);
  EXPECT_EQ(frame.pack_voltage_v, 44.5);
  EXPECT_EQ(frame.pack_current_a, 1.25);
  EXPECT_FALSE(frame.emergency_stop);
  EXPECT_FALSE(frame.has_attitude);
  EXPECT_EQ(frame.angle[2], 0.0);

  ASSERT_EQ(drives->read(frame), ReadResult::none);
  EXPECT_EQ(frame.counter, 7u) << "a frame that is not fresh is left as it was";
  ASSERT_EQ(drives->read(frame), ReadResult::fresh);
  EXPECT_TRUE(frame.emergency_stop);
  ASSERT_EQ(drives->read(frame), ReadResult::failed);
  EXPECT_STREQ(drives->error_text(), "bus 2: checksum");
  EXPECT_EQ(frame.counter, 8u);
  EXPECT_EQ(drives->read(frame), ReadResult::none) << "past the end of the recording";
}

TEST(Drives, NotANumberPassesUnchangedForTheGateToJudge) {
  const Folder folder;
  std::string error;
  const auto drives = Drives::open(
      playback_config(folder, "frame 1 1 nan 0  0 0  0 0  0 0  0 0 0  0 0 inf  40 0 0\n"), error);
  ASSERT_NE(drives, nullptr) << error;
  safety::SensorFrame frame;
  ASSERT_EQ(drives->read(frame), ReadResult::fresh);
  EXPECT_TRUE(std::isnan(frame.angle[0]));
  EXPECT_TRUE(std::isinf(frame.acceleration.z));
}

TEST(Drives, ATornRecordingIsAFailureWithWords) {
  const Folder folder;
  std::string error;
  const auto drives = Drives::open(playback_config(folder, "frame 1 1 0.5 0  0"), error);
  ASSERT_NE(drives, nullptr) << error;
  safety::SensorFrame frame;
  EXPECT_EQ(drives->read(frame), ReadResult::failed);
  EXPECT_STREQ(drives->error_text(), "the recording is damaged");
}

TEST(Drives, WhatASimulatedRobotMayOfferIsRefusedByOneThatDoesNot) {
  const Folder folder;
  std::string error;
  const auto drives = Drives::open(playback_config(folder, kRecording), error);
  ASSERT_NE(drives, nullptr) << error;
  std::string state = "before";
  EXPECT_FALSE(drives->save(state));
  EXPECT_EQ(state, "before");
  EXPECT_FALSE(drives->restore(state));
  EXPECT_FALSE(drives->carry_back(1));
}

TEST(Drives, OpenRefusedByThePluginGivesItsReason) {
  const Folder folder;
  DrivesConfig config = playback_config(folder, kRecording);
  config.options = "";
  EXPECT_EQ(open_error(config),
            "plug-in " + config.plugin +
                ": refused to open: options: found \"\", expected frames=PATH;commands=PATH");
}

TEST(Drives, EachDamagedPluginIsRefusedWithItsOwnLine) {
  const std::array<std::string, 12> expected{
      "has no symbol pastern_hal_entry, expected a plug-in of this interface",
      "does not serve interface version 2",
      "found interface version 3, expected 2",
      "found a function table of 8 bytes, expected",
      "has no name, expected one in the function table",
      "has no open function, expected one",
      "has no close function, expected one",
      "has no read function, expected one",
      "has no write function, expected one",
      "has no error_text function, expected one",
      "refused to open: bus 3:  no drive answers",
      "refused to open: xxx",
  };
  for (std::size_t i = 0; i < expected.size(); ++i) {
    const int damage = static_cast<int>(i) + 1;
    const std::string line = damaged_error(damage);
    EXPECT_EQ(line.find("plug-in " + plugin("damaged_hal_" + std::to_string(damage)) + ": " + expected[i]),
              0u)
        << line;
  }
}

TEST(Drives, AMissingFileAFolderAndATextFileAreRefused) {
  const Folder folder;
  std::ofstream(folder.file("text.so")) << "not a shared object\n";
  for (const std::string& path : {folder.file("none.so"), folder.file("."), folder.file("text.so")}) {
    DrivesConfig config;
    config.plugin = path;
    config.joint_names = {"left"};
    EXPECT_EQ(open_error(config).find("plug-in " + path + ": cannot be loaded: "), 0u);
  }
}

TEST(Drives, JointCountPeriodAndTimeoutAreJudgedBeforeAnythingIsLoaded) {
  DrivesConfig config;
  config.plugin = "nowhere.so";
  EXPECT_EQ(open_error(config), "plug-in nowhere.so: found 0 joints, expected 1 to 32");
  config.joint_names.assign(33, "j");
  EXPECT_EQ(open_error(config), "plug-in nowhere.so: found 33 joints, expected 1 to 32");
  config.joint_names.assign(2, "j");
  config.period_s = std::numeric_limits<double>::quiet_NaN();
  EXPECT_EQ(open_error(config),
            "plug-in nowhere.so: found a period or a drive timeout that is not above 0 s");
}

TEST(Drives, AFrameWithAnotherJointCountFailsAndLeavesTheFrameAlone) {
  const auto drives = open_damaged(13);
  ASSERT_NE(drives, nullptr);
  safety::SensorFrame frame;
  frame.counter = 99;
  EXPECT_EQ(drives->read(frame), ReadResult::failed);
  EXPECT_EQ(frame.counter, 99u);
  EXPECT_STREQ(drives->error_text(), "frame: found 33 joints, expected 2");
}

TEST(Drives, APluginThatNeverHasRoomForItsStateIsRefused) {
  const auto drives = open_damaged(14);
  ASSERT_NE(drives, nullptr);
  std::string state = "before";
  EXPECT_FALSE(drives->save(state));
  EXPECT_EQ(state, "before");
  EXPECT_STREQ(drives->error_text(), "two lines");
}

/// Lines of the playback plug-in's record of commands, as numbers: tick, torque_on, torques.
std::vector<std::vector<double>> written_commands(const Folder& folder) {
  std::vector<std::vector<double>> lines;
  std::ifstream file(folder.file("commands.txt"));
  for (std::string line; std::getline(file, line);) {
    std::istringstream words(line);
    lines.emplace_back(std::istream_iterator<double>(words), std::istream_iterator<double>());
  }
  return lines;
}

TEST(Drives, WhatTheGateMadeArrivesAndNothingElse) {
  const Folder folder;
  std::string error;
  const auto drives = Drives::open(playback_config(folder, kRecording), error);
  ASSERT_NE(drives, nullptr) << error;
  safety::test::Loop loop(safety::test::some_limits(2));
  loop.wanted[0] = 3.5;
  loop.wanted[1] = -2.25;
  loop.ticks(5);
  const safety::DriveCommand on = loop.tick();
  ASSERT_TRUE(on.torque_on());
  EXPECT_TRUE(drives->write(on));
  loop.flags.halt = true;
  const safety::DriveCommand off = loop.tick();
  ASSERT_FALSE(off.torque_on());
  EXPECT_TRUE(drives->write(off));

  const auto lines = written_commands(folder);
  ASSERT_EQ(lines.size(), 2u);
  EXPECT_EQ(lines[0],
            (std::vector<double>{static_cast<double>(on.tick()), 1, on.torque()[0], on.torque()[1]}));
  EXPECT_EQ(on.torque()[0], 3.5);
  EXPECT_EQ(lines[1], (std::vector<double>{static_cast<double>(off.tick()), 0, 0, 0}));
}

TEST(Drives, ACommandForAnotherRobotIsWrittenAsTorqueOff) {
  const Folder folder;
  std::string error;
  const auto drives = Drives::open(playback_config(folder, kRecording), error);
  ASSERT_NE(drives, nullptr) << error;
  safety::test::Loop loop(safety::test::some_limits(3));
  loop.wanted[0] = 3;
  loop.ticks(5);
  const safety::DriveCommand command = loop.tick();
  ASSERT_TRUE(command.torque_on());
  EXPECT_FALSE(drives->write(command));
  EXPECT_STREQ(drives->error_text(), "command: found 3 joints, expected 2; torque off was written");
  const auto lines = written_commands(folder);
  ASSERT_EQ(lines.size(), 1u);
  EXPECT_EQ(lines[0], (std::vector<double>{static_cast<double>(command.tick()), 0, 0, 0}));
}

TEST(Drives, AnAnswerThatIsNotOfTheContractIsAFailedWrite) {
  const auto drives = open_damaged(14);
  ASSERT_NE(drives, nullptr);
  safety::test::Loop loop(safety::test::some_limits(2));
  EXPECT_FALSE(drives->write(loop.tick()));
}

}  // namespace
}  // namespace pastern::hal
