#include "tests/runtime/onboard/process.h"

#include <fcntl.h>
#include <google/protobuf/text_format.h>
#include <poll.h>
#include <signal.h>
#include <sys/wait.h>
#include <unistd.h>

#include <chrono>
#include <cstdio>

#include "proto/files/durable.h"
#include "runtime/journal/journal.h"

namespace pastern::test {
namespace {

using Clock = std::chrono::steady_clock;

pid_t spawn(const std::vector<std::string>& arguments, int& output) {
  int ends[2] = {-1, -1};
  if (pipe2(ends, O_CLOEXEC) != 0) std::abort();
  std::vector<std::string> words{ONBOARD_PATH};
  words.insert(words.end(), arguments.begin(), arguments.end());
  std::vector<char*> pointers;
  for (std::string& word : words) pointers.push_back(word.data());
  pointers.push_back(nullptr);
  const pid_t process = fork();
  if (process == 0) {
    dup2(ends[1], STDOUT_FILENO);
    dup2(ends[1], STDERR_FILENO);
    execv(pointers[0], pointers.data());
    _exit(127);
  }
  close(ends[1]);
  output = ends[0];
  return process;
}

int status_of(pid_t process) {
  int status = 0;
  waitpid(process, &status, 0);
  return WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
}

bool read_some(int output, std::string& text) {
  pollfd waiting{output, POLLIN, 0};
  if (poll(&waiting, 1, 100) <= 0) return true;
  char piece[4096];
  const ssize_t length = read(output, piece, sizeof piece);
  if (length > 0) text.append(piece, static_cast<std::size_t>(length));
  return length > 0;
}

}  // namespace

Ran run_onboard(const std::vector<std::string>& arguments) {
  Ran ran;
  int output = -1;
  const pid_t process = spawn(arguments, output);
  while (read_some(output, ran.output)) {
  }
  close(output);
  ran.status = status_of(process);
  return ran;
}

Onboard::Onboard(const std::string& pace)
    : pace_(pace),
      journal_(folder_.path() + "/journal"),
      policy_path_(folder_.path() + "/start.policy"),
      robot_(shipped_robot("dunlin12")) {
  const files::PolicyFile policy = trot_file(robot_);
  policy_sha_ = files::hex(policy.sha256());
  files::Defects defects;
  EXPECT_TRUE(files::write_durably(policy_path_, policy.bytes(), 0644, defects));
  options_ = puppet_options(robot_.robot());
}

Onboard::~Onboard() {
  if (process_ > 0) end(SIGKILL);
}

std::vector<std::string> Onboard::arguments() const {
  return {"--robot",        robot_.path(), "--policy",         policy_path_,
          "--hal",          puppet_path(), "--hal-options",    options_,
          "--journal",      journal_,      "--pace",           pace_,
          "--command-port", "0",           "--telemetry-port", "0",
          "--fetch-port",   "0",           "--seed",           "5"};
}

bool Onboard::start(const std::vector<std::string>& more) {
  std::vector<std::string> words = arguments();
  words.insert(words.end(), more.begin(), more.end());
  output_.clear();
  process_ = spawn(words, pipe_);
  std::size_t ready = std::string::npos;
  while (ready == std::string::npos && read_some(pipe_, output_)) ready = output_.find("ready: ");
  while (ready != std::string::npos && output_.find('\n', ready) == std::string::npos &&
         read_some(pipe_, output_)) {
  }
  link::ClientConfig config;
  if (ready == std::string::npos ||
      std::sscanf(output_.c_str() + ready, "ready: commands %d, telemetry %d, fetch %d", &config.command_port,
                  &config.telemetry_port, &config.fetch_port) != 3) {
    return false;
  }
  std::string error;
  client_ = link::Client::connect(config, error);
  return client_ != nullptr;
}

void Onboard::send(int signal) const { kill(process_, signal); }

int Onboard::end(int signal) {
  kill(process_, signal);
  while (read_some(pipe_, output_)) {
  }
  close(pipe_);
  const int status = status_of(process_);
  process_ = -1;
  client_.reset();
  return status;
}

v1::Answer Onboard::ask(const v1::Command& command) {
  const std::optional<v1::Answer> answer = client_->ask(command, 20000);
  if (!answer) ADD_FAILURE() << client_->trouble();
  return answer.value_or(v1::Answer());
}

v1::Status Onboard::status() {
  v1::Command command;
  command.mutable_ask_status();
  return ask(command).status();
}

bool Onboard::take_baton() {
  std::string why;
  const bool taken = client_->take_baton(why);
  EXPECT_TRUE(taken) << why;
  return taken;
}

v1::Answer Onboard::confirm() {
  v1::Command command;
  command.mutable_confirm_first_start()->set_robot_sha256_hex(files::hex(robot_.sha256()));
  command.mutable_confirm_first_start()->set_who("test");
  command.mutable_confirm_first_start()->set_read_procedure(true);
  return ask(command);
}

v1::Answer Onboard::start_session(const v1::Plan& plan) {
  v1::Command command;
  EXPECT_TRUE(google::protobuf::TextFormat::PrintToString(
      plan, command.mutable_start_session()->mutable_plan_text()));
  return ask(command);
}

bool Onboard::wait_until(const std::function<bool(const v1::Status&)>& fits) {
  const Clock::time_point until = Clock::now() + std::chrono::seconds(60);
  while (Clock::now() < until) {
    if (fits(status())) return true;
    usleep(5000);
  }
  return false;
}

std::string Onboard::digest() const {
  std::string error;
  const auto journal = journal::Journal::open(journal_, error);
  if (!journal) return error;
  const auto row = journal->last_session();
  return row ? journal->digest(row->session) : "no session";
}

}  // namespace pastern::test
