// Options are "--name value" or "--name=value"; each is known by one row of a table.
#include "runtime/onboard/options.h"

#include <charconv>
#include <functional>
#include <string_view>
#include <vector>

namespace pastern::onboard {
namespace {

struct Option {
  std::string_view name;
  std::string_view expected;
  std::function<bool(const std::string&, Options&)> take;
};

Option text(std::string_view name, std::string_view expected, std::string Options::*field) {
  return {name, expected, [field](const std::string& value, Options& options) {
            options.*field = value;
            return !value.empty();
          }};
}

Option number(std::string_view name, std::string_view expected, int Options::*field, int least, int most) {
  return {name, expected, [field, least, most](const std::string& value, Options& options) {
            const char* end = value.data() + value.size();
            const auto [stop, failure] = std::from_chars(value.data(), end, options.*field);
            return failure == std::errc() && stop == end && options.*field >= least && options.*field <= most;
          }};
}

bool take_seed(const std::string& value, Options& options) {
  const char* end = value.data() + value.size();
  const auto [stop, failure] = std::from_chars(value.data(), end, options.seed);
  return failure == std::errc() && stop == end;
}

bool take_pace(const std::string& value, Options& options) {
  options.pace = value == "stepped" ? session::Pace::stepped : session::Pace::wall;
  return value == "stepped" || value == "wall";
}

const std::vector<Option>& table() {
  static const std::vector<Option> rows{
      text("--robot", "a robot file", &Options::robot),
      text("--policy", "a policy file", &Options::policy),
      text("--hal", "a plug-in's shared object", &Options::hal),
      {"--hal-options", "key=value;key=value",
       [](const std::string& value, Options& options) {
         options.hal_options = value;
         return true;
       }},
      text("--journal", "a folder", &Options::journal),
      text("--keys", "a folder", &Options::keys),
      text("--host", "an address to listen on", &Options::host),
      {"--pace", "wall or stepped", take_pace},
      number("--command-port", "a port, 0 to 65535", &Options::command_port, 0, 65535),
      number("--telemetry-port", "a port, 0 to 65535", &Options::telemetry_port, 0, 65535),
      number("--fetch-port", "a port, 0 to 65535", &Options::fetch_port, 0, 65535),
      number("--baton-lapse-ms", "100 to 60000", &Options::baton_lapse_ms, 100, 60000),
      number("--cpu", "a processor's number, 0 to 1023", &Options::cpu, 0, 1023),
      number("--priority", "a SCHED_FIFO priority, 1 to 99", &Options::priority, 1, 99),
      {"--seed", "a whole number, 0 to 2^64-1", take_seed},
  };
  return rows;
}

bool take(const std::string& name, const std::string& value, Options& options, std::string& error) {
  for (const Option& option : table()) {
    if (option.name != name) continue;
    if (option.take(value, options)) return true;
    error = name;
    error += ": found \"" + value + "\", expected ";
    error += option.expected;
    return false;
  }
  error = "found " + name + ", expected an option that is known; see pastern-onboard --help";
  return false;
}

bool complete(const Options& options, std::string& error) {
  const auto missing = [&error](const char* name, const char* what) {
    error = std::string(name) + " is missing: expected " + what + "; see pastern-onboard --help";
    return false;
  };
  if (options.robot.empty()) return missing("--robot", "a robot file");
  if (options.hal.empty()) return missing("--hal", "a plug-in's shared object");
  if (options.journal.empty()) return missing("--journal", "a folder for the record");
  return true;
}

}  // namespace

const char* help_text() {
  return R"(pastern-onboard: the real-time process on the robot

  --robot FILE          robot file (.robot.txtpb)
  --policy FILE         policy to walk with until one has been adopted in the journal folder
  --hal FILE            plug-in of the drives (shared object)
  --hal-options TEXT    the plug-in's own, "key=value;key=value"
  --journal FOLDER      where the record is kept; made when it does not exist
  --pace wall|stepped   real time (default), or simulated time that passes with the orders only
  --keys FOLDER         CURVE keys; without them the robot listens on loopback only
  --host ADDRESS        address to listen on (default 127.0.0.1)
  --command-port N      default 7741; 0 lets the system choose
  --telemetry-port N    default 7742
  --fetch-port N        default 7743
  --baton-lapse-ms N    the baton lapses without a sign of life (default 500)
  --cpu N               pin the cycle to this processor
  --priority N          SCHED_FIFO priority of the cycle (default 80)
  --seed N              for plug-ins that draw random numbers (default 0)

Examples
  pastern-onboard --robot r.robot.txtpb --policy start.policy --hal libdrives.so --journal /var/lib/pastern \
                  --keys /etc/pastern/keys --host '*' --cpu 3
  pastern-onboard --robot r.robot.txtpb --policy start.policy --hal libpastern_hal_stub.so --pace stepped \
                  --hal-options scenario=cold_store.scenario.txtpb --journal /tmp/dry --seed 1

The robot moves only on a command over the link, after its robot file was confirmed once in this journal
folder. SIGTERM and SIGINT stop it in order (damp, lower, torque off), then the program ends.
Exit status: 0 stopped in order, 2 usage, 3 a file is wrong, 70 internal.
)";
}

std::optional<Options> parse_options(int argc, const char* const* argv, std::string& error) {
  Options options;
  for (int i = 1; i < argc; ++i) {
    const std::string word = argv[i];
    if (word == "--help" || word == "-h") {
      options.help = true;
      return options;
    }
    const std::size_t equals = word.find('=');
    if (word.rfind("--", 0) != 0) {
      error = "found \"" + word + "\", expected an option; see pastern-onboard --help";
      return std::nullopt;
    }
    if (equals == std::string::npos && i + 1 >= argc) {
      error = word + ": expected a value after it; see pastern-onboard --help";
      return std::nullopt;
    }
    const std::string name = word.substr(0, equals);
    const std::string value = equals == std::string::npos ? argv[++i] : word.substr(equals + 1);
    if (!take(name, value, options, error)) return std::nullopt;
  }
  if (!complete(options, error)) return std::nullopt;
  return options;
}

}  // namespace pastern::onboard
