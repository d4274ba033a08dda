// One verb of the ground command. Adding one: a file in tools/verbs with a class and its make_NAME(), and one
// line in tools/verbs/verbs.def. One verb runs in one process, on the main thread.
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "tools/pastern/options.h"

namespace pastern::tools {

/// What the process returns. Documented in `pastern --help`.
enum class Exit : int {
  done = 0,
  findings = 1,     ///< done, with findings (check), or the verdict is to keep the start policy
  usage = 2,        ///< arguments
  file_wrong = 3,   ///< a file that the verb needs is missing, unreadable or defective
  not_reached = 4,  ///< no answer from the robot
  refused = 5,      ///< the robot answered no
  tripped = 6,      ///< the gate has tripped
  internal = 70,
};

class Verb {
 public:
  Verb() = default;
  virtual ~Verb() = default;
  Verb(const Verb&) = delete;
  Verb& operator=(const Verb&) = delete;

  [[nodiscard]] virtual const char* name() const = 0;
  /// A sentence, shown in the list of verbs.
  [[nodiscard]] virtual const char* about() const = 0;
  /// Heading under which the list of verbs shows it.
  [[nodiscard]] virtual const char* group() const = 0;
  /// Lines for the end of --help, each a command that a human could type.
  [[nodiscard]] virtual std::vector<std::string> examples() const = 0;
  /// Declares options. Values live in the verb.
  virtual void options(Options& options) = 0;
  /// Runs after the arguments were read. Facts go to standard output, complaints (one line each) to standard
  /// error.
  [[nodiscard]] virtual Exit run() = 0;
};

/// All verbs in the order of verbs.def.
[[nodiscard]] std::vector<std::unique_ptr<Verb>> all_verbs();

/// Reads the arguments, runs the verb; what main() returns. Wrong arguments: one line, Exit::usage.
[[nodiscard]] int run_command(const std::vector<std::string>& arguments);

}  // namespace pastern::tools
