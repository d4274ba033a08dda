// pastern-onboard: wiring. Threads:
//   session   this one: files, journal, sessions, commands (Program)
//   cycle     wall pace only: the tick (session/wall_mover)
//   link      sockets, stops, the baton (link/server), and ZeroMQ's own
// Exit status: 0 stopped in order, 2 usage, 3 a file is wrong, 70 internal.
#include <csignal>
#include <cstdio>
#include <exception>
#include <filesystem>
#include <system_error>

#include "runtime/hal/drives.h"
#include "runtime/onboard/options.h"
#include "runtime/onboard/program.h"
#include "runtime/session/in_process.h"

namespace pastern::onboard {
namespace {

constexpr int kUsage = 2;
constexpr int kFile = 3;

Leaving leaving;
std::atomic<session::Signals*> signals_to_stop{nullptr};  // at wall pace

// Only lock-free stores: allowed in a signal handler. At stepped pace the walk in progress takes milliseconds
// and is finished instead.
void on_signal(int) {
  leaving.asked.store(true, std::memory_order_release);
  session::Signals* signals = signals_to_stop.load(std::memory_order_acquire);
  if (signals != nullptr) signals->internal_stop.store(true, std::memory_order_release);
}

void catch_signals() {
  struct sigaction action {};
  action.sa_handler = on_signal;
  sigemptyset(&action.sa_mask);
  sigaction(SIGTERM, &action, nullptr);
  sigaction(SIGINT, &action, nullptr);
  std::signal(SIGPIPE, SIG_IGN);
}

int complain(int status, const std::string& words) {
  std::fprintf(stderr, "pastern-onboard: %s\n", words.c_str());
  return status;
}

int complain(const files::Defects& defects) {
  std::fputs(files::lines(defects).c_str(), stderr);
  return kFile;
}

// The adopted policy if there is one, else the one given; the given one is kept in the journal, so that one
// can go back to it.
std::optional<files::PolicyFile> current_policy(const Options& options, const files::RobotFile& robot,
                                                journal::Journal& journal, files::Defects& defects) {
  std::optional<files::PolicyFile> given;
  if (!options.policy.empty()) {
    given = files::read_policy(options.policy, robot, defects);
    if (!given) return std::nullopt;
    (void)journal.store_policy(given->bytes(), files::hex(given->sha256())).ok;
  }
  const std::vector<journal::Adoption> adoptions = journal.adoptions();
  if (adoptions.empty()) {
    if (!given)
      defects.push_back({"--policy", "", "nothing", "a policy file: none has been adopted here yet"});
    return given;
  }
  const std::string& sha = adoptions.back().policy_sha256_hex;
  const std::optional<std::string> bytes = journal.policy(sha);
  if (!bytes) {
    defects.push_back({options.journal, "", "no bytes of the adopted policy " + sha, "them"});
    return std::nullopt;
  }
  return files::parse_policy(*bytes, "adopted policy " + sha, robot, defects);
}

std::unique_ptr<session::Mover> make_mover(const Options& options, session::Cycle& cycle,
                                           const journal::Journal& journal) {
  if (options.pace == session::Pace::stepped) return session::make_stepped_mover(cycle);
  const std::optional<std::string> bytes = journal.robot_state();
  v1::CarriedState state;
  if (bytes && !bytes->empty() && state.ParseFromString(*bytes)) (void)cycle.restore(state, false);
  signals_to_stop.store(&cycle.signals(), std::memory_order_release);
  return session::make_wall_mover(cycle, {options.cpu, options.priority});
}

int serve(const Options& options, const files::RobotFile& robot, journal::Journal& journal) {
  files::Defects defects;
  std::optional<files::PolicyFile> policy = current_policy(options, robot, journal, defects);
  if (!policy) return complain(defects);
  std::string error;
  auto drives = hal::Drives::open(
      session::drives_config(robot, options.hal, options.hal_options, options.seed, options.pace), error);
  if (!drives) return complain(kFile, error);
  const std::string drives_name = drives->name();
  std::string drives_settings = options.hal_options;
  if (!drives->about().empty()) drives_settings += ";" + drives->about();
  session::Cycle cycle(robot.robot(), policy->policy(), std::move(drives), options.pace);
  const std::unique_ptr<session::Mover> mover = make_mover(options, cycle, journal);
  mover->signals().baton_lost.store(true, std::memory_order_release);  // until somebody holds it
  Exchange exchange(mover->signals());
  Program program(
      {robot, *policy, options.journal, *mover, journal, exchange, leaving, drives_name, drives_settings});
  if (!program.trouble().empty()) return complain(kFile, program.trouble());
  const link::ServerConfig config{options.host,       options.command_port, options.telemetry_port,
                                  options.fetch_port, options.keys,         options.baton_lapse_ms};
  const std::unique_ptr<link::Server> server = link::Server::start(config, exchange, error);
  if (!server) return complain(kFile, error);
  program.connect(*server);
  const link::Ports ports = server->ports();
  std::printf("%s: robot %s (%s), policy %s\n", session::software().c_str(), robot.robot().name().c_str(),
              drives_name.c_str(), files::hex(policy->sha256()).c_str());
  std::printf("%s\n", mover->scheduling().c_str());
  std::printf("ready: commands %d, telemetry %d, fetch %d on %s\n", ports.command, ports.telemetry,
              ports.fetch, options.host.c_str());
  std::fflush(stdout);
  program.run();
  signals_to_stop.store(nullptr, std::memory_order_release);
  std::printf("stopped in order\n");
  return 0;
}

int start(int argc, const char* const* argv) {
  std::string error;
  const std::optional<Options> options = parse_options(argc, argv, error);
  if (!options) return complain(kUsage, error);
  if (options->help) {
    std::fputs(help_text(), stdout);
    return 0;
  }
  files::Defects defects;
  const std::optional<files::RobotFile> robot = files::read_robot(options->robot, defects);
  if (!robot) return complain(defects);
  std::error_code made;
  std::filesystem::create_directory(options->journal, made);
  const std::unique_ptr<journal::Journal> journal = journal::Journal::open(options->journal, error);
  if (!journal) return complain(kFile, error);
  catch_signals();
  return serve(*options, *robot, *journal);
}

}  // namespace
}  // namespace pastern::onboard

int main(int argc, char** argv) {
  try {
    return pastern::onboard::start(argc, argv);
  } catch (const std::exception& failure) {
    std::fprintf(stderr, "pastern-onboard: internal: %s\n", failure.what());
    return 70;
  }
}
