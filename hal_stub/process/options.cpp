// Command line of pastern-stub-robot.
#include "hal_stub/process/options.h"

#include <charconv>
#include <map>

namespace pastern::stub {
namespace {

bool parse_number(const std::string& text, std::uint64_t& number) {
  const char* end = text.data() + text.size();
  const auto [stop, failure] = std::from_chars(text.data(), end, number);
  return failure == std::errc() && stop == end;
}

}  // namespace

const char* usage() {
  return "pastern-stub-robot: simulated drives and body as a process of their own, at wall pace\n"
         "  --robot FILE       robot file\n"
         "  --socket PATH      socket of the simulated drive bus, made by this process\n"
         "  --scenario FILE    the site; nominal when absent\n"
         "  --seed NUMBER      of everything random; 0 when absent\n"
         "  --trace FILE       appends what is really so, one line each 10 ticks (columns named in the first "
         "line)\n"
         "  --every NUMBER     a line of the trace each so many ticks\n"
         "Prints \"ready PATH\" when the socket listens. Ends on SIGINT and SIGTERM. Exit status 2: usage, "
         "3: a file is\n"
         "wrong, 70: the socket or the trace cannot be made.\n";
}

bool parse_command_line(int count, char** words, ProcessOptions& options, std::string& error) {
  const std::map<std::string, std::string*> texts = {{"--robot", &options.robot},
                                                     {"--scenario", &options.scenario},
                                                     {"--socket", &options.socket},
                                                     {"--trace", &options.trace}};
  const std::map<std::string, std::uint64_t*> numbers = {{"--seed", &options.seed},
                                                         {"--every", &options.every}};
  for (int i = 1; i < count; ++i) {
    const std::string word = words[i];
    if (word == "--help" || word == "-h") {
      options.help = true;
      return true;
    }
    const auto text = texts.find(word);
    const auto number = numbers.find(word);
    if (text == texts.end() && number == numbers.end()) {
      error = "found \"" + word + "\", expected an option (--help lists them)";
      return false;
    }
    if (++i == count) {
      error = word + ": found nothing after it, expected a value";
      return false;
    }
    if (text != texts.end()) *text->second = words[i];
    if (number != numbers.end() && !parse_number(words[i], *number->second)) {
      error = word + ": found \"" + words[i] + "\", expected a whole number";
      return false;
    }
  }
  if (options.robot.empty() || options.socket.empty() || options.every == 0) {
    error = options.every == 0 ? "--every: found 0, expected 1 or more"
                               : "expected --robot FILE and --socket PATH";
    return false;
  }
  return true;
}

}  // namespace pastern::stub
