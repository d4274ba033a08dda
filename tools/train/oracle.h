// What a site has to give: the best policy that training on that very site finds from the start policy, and
// how far the start policy stays behind it.
#pragma once

#include <cstdint>
#include <string>

#include "tools/train/trainer.h"
#include "tools/train/walk.h"

namespace pastern::tools {

struct OracleSettings {
  std::uint64_t seed{1};
  std::uint32_t iterations{80};
  std::size_t directions{32};  ///< 80 * 2 * 32 = 5 120 walks
  double sigma{0.04};
  double step{0.01};
  std::size_t look_walks{64};
  std::uint32_t look_every{4};
  std::size_t judging_walks{400};  ///< of start and oracle, common lots
};

struct Gap {
  Look start;
  Look oracle;
  Parameters parameters;  ///< the oracle's
  [[nodiscard]] double gain() const { return oracle.mean_return - start.mean_return; }
};

/// Antithetic evolution strategies with Adam from `start` on one site; best snapshot by looks on lots of
/// their own; both policies then judged on common lots that neither training nor looks met.
[[nodiscard]] Gap find_gap(const WalkCourse& site, const Parameters& start, const OracleSettings& settings,
                           unsigned threads);

}  // namespace pastern::tools
