// See options.h.
#include "tools/pastern/options.h"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <type_traits>

namespace pastern::tools {
namespace {

template <class T>
CLI::Validator within(T min, T max) {
  return CLI::Validator(
      [min, max](std::string& word) {
        T value{};
        // A minus before an unsigned number would be wrapped round, not refused.
        if (std::is_unsigned_v<T> && word.find('-') != std::string::npos) {
          return fmt::format("found {}, expected {} to {}", word, min, max);
        }
        if (!CLI::detail::lexical_cast(word, value))
          return fmt::format("found '{}', expected a number", word);
        // Written so that NaN is refused.
        return value >= min && value <= max ? std::string()
                                            : fmt::format("found {}, expected {} to {}", word, min, max);
      },
      fmt::format("{} to {}", min, max));
}

}  // namespace

Options& Options::flag(const std::string& name, bool& value, const std::string& help) {
  app_.add_flag(name, value, help);
  return *this;
}

Options& Options::text(const std::string& name, std::string& value, const std::string& help, bool required) {
  app_.add_option(name, value, help)->required(required)->capture_default_str();
  return *this;
}

Options& Options::texts(const std::string& name, std::vector<std::string>& values, const std::string& help,
                        bool required) {
  app_.add_option(name, values, help)->required(required);
  return *this;
}

Options& Options::number(const std::string& name, double& value, const std::string& help, double min,
                         double max) {
  app_.add_option(name, value, help)->check(within(min, max))->capture_default_str();
  return *this;
}

Options& Options::whole(const std::string& name, std::uint64_t& value, const std::string& help,
                        std::uint64_t min, std::uint64_t max) {
  app_.add_option(name, value, help)->check(within(min, max))->capture_default_str();
  return *this;
}

Options& Options::whole(const std::string& name, int& value, const std::string& help, int min, int max) {
  app_.add_option(name, value, help)->check(within(min, max))->capture_default_str();
  return *this;
}

Options& Options::choice(const std::string& name, std::string& value, const std::vector<std::string>& words,
                         const std::string& help, bool required) {
  app_.add_option(name, value, help)->required(required)->check(CLI::IsMember(words))->capture_default_str();
  return *this;
}

}  // namespace pastern::tools
