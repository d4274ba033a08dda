// Starts and ends the onboard program.
#include "tests/bench/rig/onboard_process.h"

#include <fcntl.h>
#include <google/protobuf/text_format.h>
#include <sys/mman.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cerrno>
#include <csignal>
#include <cstdio>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <optional>
#include <vector>

#include "proto/files/policy_file.h"
#include "tests/bench/rig/robot_in_loop.h"

namespace pastern::bench {
namespace {

bool write_file(const std::string& path, const std::string& bytes) {
  std::ofstream file(path, std::ios::binary);
  file << bytes;
  return file.good();
}

const looped_ring* map_ring(const std::string& path) {
  const int file = open(path.c_str(), O_RDONLY | O_CLOEXEC);
  if (file < 0) return nullptr;
  void* const at = mmap(nullptr, sizeof(looped_ring), PROT_READ, MAP_SHARED, file, 0);
  (void)close(file);
  return at == MAP_FAILED ? nullptr : static_cast<const looped_ring*>(at);
}

[[noreturn]] void become(const std::vector<std::string>& words, int out) {
  (void)dup2(out, STDOUT_FILENO);
  std::vector<char*> arguments;
  for (const std::string& word : words) arguments.push_back(const_cast<char*>(word.c_str()));
  arguments.push_back(nullptr);
  (void)execv(arguments[0], arguments.data());
  _exit(127);
}

}  // namespace

std::unique_ptr<OnboardProcess> OnboardProcess::start(const v1::Robot& robot, const std::string& folder,
                                                      const std::string& more_hal_options, std::string& error,
                                                      const std::string& key_folder) {
  std::string text;
  files::Defects defects;
  if (!google::protobuf::TextFormat::PrintToString(robot, &text)) error = "the robot cannot be printed";
  const std::string robot_path = folder + "/bench.robot.txtpb";
  if (!write_file(robot_path, text) ||
      !write_file(folder + "/bench.policy", files::pack_policy(policy_of_fixed_shape(robot)))) {
    error = "cannot write into " + folder;
    return nullptr;
  }
  std::optional<files::RobotFile> file = files::read_robot(robot_path, defects);
  if (!file) {
    error = files::lines(defects);
    return nullptr;
  }
  std::unique_ptr<OnboardProcess> process(new OnboardProcess(std::move(*file)));
  const std::string options = looped_options(robot) + ";ring=" + folder + "/ring" + more_hal_options;
  return process->launch(folder, options, key_folder, error) ? std::move(process) : nullptr;
}

bool OnboardProcess::launch(const std::string& folder, const std::string& hal_options,
                            const std::string& key_folder, std::string& error) {
  // A file, not a pipe: nobody reads on while the program goes on printing.
  const std::string out_path = folder + "/out";
  const int out = open(out_path.c_str(), O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0600);
  std::vector<std::string> words{PASTERN_ONBOARD,
                                 "--robot=" + robot_.path(),
                                 "--policy=" + folder + "/bench.policy",
                                 "--hal=" + looped_plugin(),
                                 "--hal-options=" + hal_options,
                                 "--journal=" + folder + "/journal",
                                 "--pace=wall",
                                 "--command-port=0",
                                 "--telemetry-port=0",
                                 "--fetch-port=0"};
  if (!key_folder.empty()) words.push_back("--keys=" + key_folder);
  child_ = fork();
  if (child_ == 0) become(words, out);
  (void)close(out);
  for (int i = 0; i < 1000 && command_port_ == 0; ++i) {
    if (waitpid(child_, nullptr, WNOHANG) == child_) {
      child_ = -1;
      break;
    }
    (void)usleep(10'000);
    look_for_ready(out_path);
  }
  ring_ = map_ring(folder + "/ring");
  if (command_port_ != 0 && ring_ != nullptr) return true;
  error = "pastern-onboard did not start";
  return false;
}

void OnboardProcess::look_for_ready(const std::string& out_path) {
  std::ifstream out(out_path);
  std::string line;
  std::string last;
  while (std::getline(out, line)) {
    if (std::sscanf(line.c_str(), "ready: commands %d, telemetry %d, fetch %d", &command_port_,
                    &telemetry_port_, &fetch_port_) == 3) {
      scheduling_ = last;
      return;
    }
    command_port_ = 0;
    last = line;
  }
}

bool OnboardProcess::alive() {
  if (child_ > 0 && waitpid(child_, nullptr, WNOHANG) == child_) child_ = -1;
  return child_ > 0;
}

OnboardProcess::~OnboardProcess() {
  if (ring_ != nullptr) (void)munmap(const_cast<looped_ring*>(ring_), sizeof(looped_ring));
  if (child_ <= 0) return;
  (void)kill(child_, SIGTERM);
  for (int i = 0; i < 500; ++i) {
    if (waitpid(child_, nullptr, WNOHANG) == child_) return;
    (void)usleep(10'000);
  }
  (void)kill(child_, SIGKILL);
  (void)waitpid(child_, nullptr, 0);
}

}  // namespace pastern::bench
