// Something compiled for a set as packed walks are: lanes, and standard templates that a plain program uses
// as well.
#include <algorithm>
#include <memory>
#include <stdexcept>
#include <vector>

#include "tools/packed/functions.h"

namespace pastern::packed::PASTERN_LANES_SET {

double probed(const std::vector<double>& numbers);

double probed(const std::vector<double>& numbers) {
  if (numbers.empty()) throw std::invalid_argument("no numbers");
  std::vector<double> copy;
  for (const double a : numbers) copy.push_back(a);
  std::sort(copy.begin(), copy.end());
  const auto shared = std::make_shared<std::vector<double>>(copy);
  Doubles total(0);
  for (const double a : *shared) total = total + exp(Doubles(a));
  return total[0];
}

}  // namespace pastern::packed::PASTERN_LANES_SET
