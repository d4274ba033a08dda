// Frames that come late or are told twice: which frame a bus tells in a tick, a pure function of seed, draw
// and tick. The simulated robot and walks in lanes ask the same.
#pragma once

#include <cstdint>

#include "hal_stub/robot/random.h"

namespace pastern::stub {

struct FrameFlaws {
  double late{0};               ///< share of frames that come late
  double repeated{0};           ///< share in whose stead the one before is told again
  std::uint32_t late_ticks{1};  ///< that a late one takes
  [[nodiscard]] bool any() const noexcept { return late > 0 || repeated > 0; }
};

inline constexpr std::uint32_t kMostRepeats = 16;  ///< in a row; at a share of 0.5 once in 65 536 frames

/// The newest frame that the bus has told by a tick.
struct FrameNews {
  std::uint32_t age{0};  ///< ticks; 0: this tick's
  bool again{false};     ///< it was told before, and is told again in this tick
};

/// Oldest that news can be, ticks.
inline std::uint32_t oldest_news(const FrameFlaws& flaws) noexcept {
  if (!flaws.any()) return 0;
  return (flaws.late > 0 ? flaws.late_ticks : 0) + kMostRepeats;
}

/// `tick` since placed. Frames keep their order: behind a late one the newer ones wait.
inline FrameNews news_of(const FrameFlaws& flaws, std::uint64_t seed, std::uint64_t draw,
                         std::uint32_t tick) noexcept {
  const auto words = [&](std::uint32_t at) { return random_words(seed, draw, at, Chance::frames, 0); };
  std::uint32_t newest = tick;
  for (std::uint32_t at = tick >= flaws.late_ticks ? tick - flaws.late_ticks + 1 : 1; at <= tick; ++at) {
    if (at == 0 || !(uniform_of(words(at)[0]) < flaws.late)) continue;
    newest = at - 1;
    break;
  }
  FrameNews news;
  const bool waits = newest < tick;
  for (std::uint32_t n = 0; n < kMostRepeats && newest > 0; ++n) {
    if (!(uniform_of(words(newest)[1]) < flaws.repeated)) break;
    --newest;
  }
  news.age = tick - newest;
  news.again = !waits && newest < tick;
  return news;
}

}  // namespace pastern::stub
