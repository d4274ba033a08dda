// Arguments in, one verb run, exit status out.
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cstdio>
#include <exception>

#include "tools/pastern/verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

constexpr const char* kAbout =
    "pastern: adapt a legged robot's walking policy on the robot, at the site of work.\n"
    "Not a certified safety function: keep the emergency stop in your hand, and follow the local rules.";

constexpr const char* kClosing =
    "Exit status:\n"
    "   0  done\n"
    "   1  done, with findings (check), or the verdict is to keep the start policy\n"
    "   2  wrong arguments\n"
    "   3  a file is missing, unreadable or wrong\n"
    "   4  the robot was not reached\n"
    "   5  the robot refused\n"
    "   6  the gate has tripped\n"
    "  70  internal error\n"
    "\n"
    "An order that often fits: check, confirm, status, start, report, adopt.\n"
    "In a hurry: `pastern stop` (controlled) and `pastern halt` (torque off at once; a standing robot "
    "falls).";

std::string examples_of(const Verb& verb) {
  std::string text = "Examples:";
  for (const std::string& line : verb.examples()) text += "\n  " + line;
  return text;
}

/// CLI11's own text may span lines; the promise is one.
std::string one_line(std::string text) {
  std::replace(text.begin(), text.end(), '\n', ' ');
  return text;
}

int usage(const std::string& words, const std::string& verb) {
  const std::string where = verb.empty() ? "pastern" : "pastern " + verb;
  complain(fmt::format("{}: {} (`{} --help` shows what it takes)", where, one_line(words), where));
  return static_cast<int>(Exit::usage);
}

bool is_verb(const std::string& word, const std::vector<std::unique_ptr<Verb>>& verbs) {
  return std::any_of(verbs.begin(), verbs.end(), [&](const auto& verb) { return word == verb->name(); });
}

std::string no_such_verb(const std::string& word, const std::vector<std::unique_ptr<Verb>>& verbs) {
  std::string names;
  for (const auto& verb : verbs) names += (names.empty() ? "" : ", ") + std::string(verb->name());
  return fmt::format("no verb '{}': expected one of {}", word, names);
}

void declare(CLI::App& app, const std::vector<std::unique_ptr<Verb>>& verbs) {
  app.set_version_flag("--version", fmt::format("pastern {}", PASTERN_VERSION));
  app.require_subcommand(1);
  app.get_formatter()->label("SUBCOMMAND", "VERB");
  app.footer(kClosing);
  for (const auto& verb : verbs) {
    CLI::App* sub = app.add_subcommand(verb->name(), verb->about());
    sub->group(verb->group());
    sub->footer(examples_of(*verb));
    Options options(*sub);
    verb->options(options);
  }
}

}  // namespace

int run_command(const std::vector<std::string>& arguments) {
  const std::vector<std::unique_ptr<Verb>> verbs = all_verbs();
  CLI::App app{kAbout, "pastern"};
  declare(app, verbs);
  const std::string first = arguments.empty() ? "" : arguments[0];
  if (arguments.empty()) return usage("which verb?", "");
  const bool general = first == "-h" || first == "--help" || first == "--version";
  if (!first.empty() && first[0] == '-' && !general) {
    return usage(fmt::format("found '{}', expected a verb first", first), "");
  }
  if (!first.empty() && first[0] != '-' && !is_verb(first, verbs)) {
    return usage(no_such_verb(first, verbs), "");
  }
  try {
    app.parse(std::vector<std::string>(arguments.rbegin(), arguments.rend()));
  } catch (const CLI::Success& asked_for_help) {
    return app.exit(asked_for_help);
  } catch (const CLI::ParseError& error) {
    return usage(error.what(), is_verb(first, verbs) ? first : "");
  }
  try {
    for (const auto& verb : verbs) {
      if (app.got_subcommand(verb->name())) return static_cast<int>(verb->run());
    }
  } catch (const std::exception& error) {
    complain(fmt::format("pastern: internal error: {}", one_line(error.what())));
  }
  return static_cast<int>(Exit::internal);
}

}  // namespace pastern::tools
