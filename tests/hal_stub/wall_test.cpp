// The simulated robot as a process of its own: what happens to it when the program that drives it stops.
// Times are of the robot's own clock (its trace), so that a slow machine changes nothing.
#include <dlfcn.h>
#include <fcntl.h>
#include <gtest/gtest.h>
#include <sys/wait.h>
#include <unistd.h>

#include <chrono>
#include <csignal>
#include <cstring>
#include <fstream>
#include <sstream>
#include <string>
#include <thread>
#include <vector>

#include "hal_stub/plugin/bus.h"
#include "proto/files/robot_file.h"
#include "runtime/hal/pastern_hal.h"

namespace pastern::stub {
namespace {

using namespace std::chrono_literals;

const std::string kRobot = PASTERN_SOURCE_DIR "/hal_stub/robots/dunlin12.robot.txtpb";

struct Line {
  double time_s{0};
  double height_m{0};
  std::string torque;
  double torque_max_nm{0};
  std::uint64_t commands{0};
};

class Wall : public ::testing::Test {
 protected:
  void SetUp() override {
    char name[] = "/tmp/pastern-wall-XXXXXX";
    folder_ = mkdtemp(name);
    socket_ = folder_ + "/bus";
    trace_ = folder_ + "/trace";
    files::Defects defects;
    const auto robot = files::read_robot(kRobot, defects);
    ASSERT_TRUE(robot) << files::lines(defects);
    robot_ = robot->robot();
    for (const auto& joint : robot_.joints()) names_.push_back(joint.name().c_str());
    library_ = dlopen(PASTERN_BINARY_DIR "/lib/libpastern_hal_stub.so", RTLD_NOW | RTLD_LOCAL);
    ASSERT_NE(library_, nullptr) << dlerror();
    table_ =
        reinterpret_cast<pastern_hal_entry_fn>(dlsym(library_, "pastern_hal_entry"))(PASTERN_HAL_VERSION);
    ASSERT_NE(table_, nullptr);
  }
  void TearDown() override {
    if (process_ > 0) {
      kill(process_, SIGKILL);
      waitpid(process_, nullptr, 0);
    }
    for (const char* file : {"/bus", "/trace"}) unlink((folder_ + file).c_str());
    rmdir(folder_.c_str());
    if (library_ != nullptr) dlclose(library_);
  }

  /// Starts the robot's process and waits for its word.
  void start(const std::vector<std::string>& more = {}) {
    std::vector<std::string> words = {PASTERN_BINARY_DIR "/bin/pastern-stub-robot",
                                      "--robot",
                                      kRobot,
                                      "--socket",
                                      socket_,
                                      "--trace",
                                      trace_,
                                      "--every",
                                      "1"};
    words.insert(words.end(), more.begin(), more.end());
    int out[2];
    ASSERT_EQ(pipe(out), 0);
    process_ = fork();
    if (process_ == 0) {
      dup2(out[1], 1);
      std::vector<char*> argv;
      for (auto& word : words) argv.push_back(word.data());
      argv.push_back(nullptr);
      execv(argv[0], argv.data());
      _exit(127);
    }
    close(out[1]);
    char text[300] = "";
    ASSERT_GT(::read(out[0], text, sizeof text - 1), 0);
    close(out[0]);
    ASSERT_EQ(std::string(text).rfind("ready ", 0), 0U) << text;
  }

  void* open(std::string* error = nullptr) {
    options_ = "socket=" + socket_;
    pastern_hal_config c{};
    c.struct_size = sizeof c;
    c.joint_count = static_cast<std::uint32_t>(names_.size());
    c.joint_names = names_.data();
    c.period_s = 0.001;
    c.drive_timeout_s = 0.02;
    c.robot_file = kRobot.c_str();
    c.options = options_.c_str();
    char line[400] = "";
    void* handle = table_->open(&c, line, sizeof line);
    if (error != nullptr) *error = line;
    return handle;
  }

  /// PD from the lying pose to the stance in one second, then held, about once a millisecond.
  void rise(void* handle, int ticks) {
    pastern_hal_frame frame{};
    frame.struct_size = sizeof frame;
    while (table_->read(handle, &frame) != PASTERN_HAL_OK) std::this_thread::sleep_for(1ms);
    const std::vector<double> from(frame.angle_rad, frame.angle_rad + names_.size());
    for (int k = 0; k < ticks; ++k) {
      ASSERT_NE(table_->read(handle, &frame), PASTERN_HAL_FAILED) << table_->error_text(handle);
      pastern_hal_command command{};
      command.struct_size = sizeof command;
      command.joint_count = static_cast<std::uint32_t>(names_.size());
      command.torque_on = 1;
      const double s = std::min(1.0, k / 1000.0);
      for (int j = 0; j < robot_.joints_size(); ++j) {
        const auto n = static_cast<std::size_t>(j);
        const double target = from[n] + s * (robot_.joints(j).stance_rad() - from[n]);
        command.torque_nm[j] = robot_.joints(j).stiffness_nm_per_rad() * (target - frame.angle_rad[j]) -
                               robot_.joints(j).damping_nm_s_per_rad() * frame.speed_rad_s[j];
      }
      (void)table_->write(handle, &command);
      std::this_thread::sleep_for(1ms);
    }
  }

  std::vector<Line> trace() const {
    std::ifstream file(trace_);
    std::string text;
    std::getline(file, text);
    std::vector<Line> lines;
    while (std::getline(file, text)) {
      std::istringstream words(text);
      Line line;
      std::string skip;
      words >> skip >> line.time_s >> skip >> skip >> line.height_m >> skip >> skip >> skip >> line.torque >>
          line.torque_max_nm >> skip >> line.commands;
      if (words) lines.push_back(line);
    }
    return lines;
  }

  /// Waits until the robot's own time has gone on by `seconds`.
  void wait_for_robot(double seconds) {
    const auto before = trace();
    const double begin = before.empty() ? 0 : before.back().time_s;
    for (int i = 0; i < 2000; ++i) {
      std::this_thread::sleep_for(20ms);
      const auto now = trace();
      if (!now.empty() && now.back().time_s > begin + seconds) return;
    }
    FAIL() << "the robot's time stands still";
  }

  /// The drives timed out by themselves: on, damping from 20 ms on, off from 520 ms on, and the robot lies.
  void expect_limp_after_silence() {
    const auto lines = trace();
    std::size_t last = 0;
    for (std::size_t i = 1; i < lines.size(); ++i) {
      if (lines[i].commands > lines[i - 1].commands) last = i;
    }
    ASSERT_GT(lines[last].height_m, 0.30) << "it stood before";
    double damping = 0;
    double off = 0;
    for (std::size_t i = last; i < lines.size(); ++i) {
      if (damping == 0 && lines[i].torque == "damping") damping = lines[i].time_s - lines[last].time_s;
      if (off == 0 && lines[i].torque == "off") off = lines[i].time_s - lines[last].time_s;
    }
    // 2 ms of bus delay, then 20 ms; 0.5 s of damping.
    EXPECT_NEAR(damping, 0.023, 0.0015);
    EXPECT_NEAR(off, 0.523, 0.0015);
    EXPECT_EQ(lines.back().torque, "off");
    EXPECT_EQ(lines.back().torque_max_nm, 0);
    EXPECT_LT(lines.back().height_m, 0.2);
  }

  std::string folder_;
  std::string socket_;
  std::string trace_;
  std::string options_;
  v1::Robot robot_;
  std::vector<const char*> names_;
  void* library_{nullptr};
  const pastern_hal* table_{nullptr};
  pid_t process_{-1};
};

TEST_F(Wall, RobotRisesAndGoesLimpByItselfWhenCommandsStop) {
  start();
  std::string error;
  void* handle = open(&error);
  ASSERT_NE(handle, nullptr) << error;
  ASSERT_EQ(table_->carry_back(handle, 3), PASTERN_HAL_OK);
  rise(handle, 1500);
  wait_for_robot(1.2);
  expect_limp_after_silence();
  table_->close(handle);
}

TEST_F(Wall, RobotGoesLimpWhenTheProgramThatDrivesItIsKilledOrStopped) {
  start();
  const pid_t driver = fork();
  if (driver == 0) {
    void* handle = open();
    if (handle == nullptr) _exit(1);
    rise(handle, 100000);
    _exit(0);
  }
  wait_for_robot(1.8);
  kill(driver, SIGSTOP);
  wait_for_robot(1.2);
  expect_limp_after_silence();
  kill(driver, SIGCONT);  // it goes on as if nothing had happened, with the torque that it was about to write
  const std::uint64_t before = trace().back().commands;
  wait_for_robot(0.3);
  EXPECT_GT(trace().back().commands, before);
  EXPECT_EQ(trace().back().torque, "off");
  kill(driver, SIGKILL);
  waitpid(driver, nullptr, 0);
}

TEST_F(Wall, TheNextProgramFindsTheRobotWhereItWasLeft) {
  start();
  void* first = open();
  ASSERT_NE(first, nullptr);
  rise(first, 1300);
  table_->close(first);
  void* second = open();
  ASSERT_NE(second, nullptr);
  pastern_hal_frame frame{};
  frame.struct_size = sizeof frame;
  for (int i = 0; i < 100 && table_->read(second, &frame) != PASTERN_HAL_OK; ++i)
    std::this_thread::sleep_for(1ms);
  EXPECT_NEAR(frame.angle_rad[2], robot_.joints(2).stance_rad(), 0.3);
  table_->close(second);
}

TEST_F(Wall, OnlyTheProgramThatWasWelcomedLastMovesTheRobot) {
  start();
  void* handle = open();
  ASSERT_NE(handle, nullptr);
  sockaddr_un address{};
  std::string error;
  ASSERT_TRUE(socket_address(socket_, address, error));
  const int stranger = ::socket(AF_UNIX, SOCK_DGRAM, 0);
  BusCommand command;
  command.head.kind = BusKind::command;
  command.command.joint_count = 12;
  command.command.torque_on = 1;
  const std::string garbage(1500, 'x');
  for (int i = 0; i < 200; ++i) {
    (void)::sendto(stranger, &command, sizeof command, MSG_DONTWAIT, reinterpret_cast<sockaddr*>(&address),
                   sizeof address);
    (void)::sendto(stranger, garbage.data(), static_cast<std::size_t>(i) * 7, MSG_DONTWAIT,
                   reinterpret_cast<sockaddr*>(&address), sizeof address);
    std::this_thread::sleep_for(200us);
  }
  wait_for_robot(0.1);
  EXPECT_EQ(trace().back().commands, 0U);
  EXPECT_EQ(trace().back().torque, "off");
  ::close(stranger);
  table_->close(handle);
}

TEST_F(Wall, AProgramForAnotherRobotIsRefusedInOneLine) {
  start();
  names_.pop_back();
  std::string error;
  EXPECT_EQ(open(&error), nullptr);
  EXPECT_NE(error.find("found 11 joints"), std::string::npos) << error;
}

TEST_F(Wall, ReadFailsWhenTheRobotsProcessHasGone) {
  start();
  void* handle = open();
  ASSERT_NE(handle, nullptr);
  kill(process_, SIGKILL);
  waitpid(process_, nullptr, 0);
  process_ = -1;
  pastern_hal_command command{};
  command.struct_size = sizeof command;
  command.joint_count = 12;
  EXPECT_EQ(table_->write(handle, &command), PASTERN_HAL_FAILED);
  EXPECT_NE(std::string(table_->error_text(handle)), "");
  table_->close(handle);
  // What the dead process left behind does not hinder the next.
  start();
  void* again = open();
  EXPECT_NE(again, nullptr);
  table_->close(again);
}

TEST_F(Wall, WrongCommandLinesEndWithTheirStatus) {
  const std::string program = PASTERN_BINARY_DIR "/bin/pastern-stub-robot ";
  auto status = [&](const std::string& words) {
    return WEXITSTATUS(std::system((program + words + " >/dev/null 2>&1").c_str()));
  };
  EXPECT_EQ(status("--help"), 0);
  EXPECT_EQ(status(""), 2);
  EXPECT_EQ(status("--colour red"), 2);
  EXPECT_EQ(status("--robot"), 2);
  EXPECT_EQ(status("--robot /no/such --socket " + socket_), 3);
  EXPECT_EQ(status("--robot " + kRobot + " --socket /no/such/folder/bus"), 70);
  EXPECT_EQ(status("--robot " + kRobot + " --socket " + socket_ + " --seed x"), 2);
}

}  // namespace
}  // namespace pastern::stub
