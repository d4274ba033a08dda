// Makes the operator that the settings name.
#include "runtime/adapt/operator.h"

#include <stdexcept>

#include "runtime/adapt/es_gradient.h"
#include "runtime/adapt/hill_climbing.h"

namespace pastern::adapt {

std::unique_ptr<Operator> make_operator(const Settings& settings, const Parameters& start) {
  switch (settings.kind) {
    case Kind::sequential:
    case Kind::averaged:
    case Kind::batch:
      return std::make_unique<HillClimbing>(settings, start);
    case Kind::es_gradient:
      return std::make_unique<EsGradient>(settings, start);
  }
  throw std::invalid_argument("adaptation: no such operator");
}

}  // namespace pastern::adapt
