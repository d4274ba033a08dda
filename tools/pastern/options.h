// How a verb declares its arguments. A thin front over CLI11, so that only one file compiles it.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace CLI {
class App;
}

namespace pastern::tools {

/// A name with dashes is an option ("--robot", "-r,--robot"), one without is a positional argument. The value
/// given before is the default and is shown in --help. A word that is no number of the right kind, or outside
/// the range, is a usage error in one line.
class Options {
 public:
  explicit Options(CLI::App& app) : app_(app) {}

  Options& flag(const std::string& name, bool& value, const std::string& help);
  Options& text(const std::string& name, std::string& value, const std::string& help, bool required = false);
  Options& texts(const std::string& name, std::vector<std::string>& values, const std::string& help,
                 bool required = false);
  Options& number(const std::string& name, double& value, const std::string& help, double min, double max);
  Options& whole(const std::string& name, std::uint64_t& value, const std::string& help, std::uint64_t min,
                 std::uint64_t max);
  Options& whole(const std::string& name, int& value, const std::string& help, int min, int max);
  /// One of the words.
  Options& choice(const std::string& name, std::string& value, const std::vector<std::string>& words,
                  const std::string& help, bool required = false);

 private:
  CLI::App& app_;
};

}  // namespace pastern::tools
