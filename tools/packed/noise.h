// Random words of the sensors by lanes: those that hal_stub/robot/simulated_sensors.cpp draws one after
// another, each lane with seed, draw and tick of its own. What the parts of one tick have in common in the
// first three rounds is worked out once a tick, or once a walk.
#pragma once

#include "hal_stub/robot/random.h"
#include "tools/packed/random.h"

namespace pastern::packed::PASTERN_LANES_SET {

inline constexpr std::uint32_t kPhiloxFirst = 0xD2511F53U;
inline constexpr std::uint32_t kPhiloxSecond = 0xCD9E8D57U;
inline constexpr std::uint32_t kPhiloxBump[2] = {0x9E3779B9U, 0xBB67AE85U};
inline constexpr int kPhiloxRounds = 10;

template <int N>
class SensorWords {
 public:
  using W = Words<N>;

  void put(int lane, std::uint64_t seed, std::uint64_t draw) noexcept {
    std::uint32_t key[2] = {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32U)};
    for (auto& round : key_) {
      for (unsigned k = 0; k < 2; ++k) {
        round[k].put(lane, key[k]);
        key[k] += kPhiloxBump[k];
      }
    }
    draw_low_.put(lane, static_cast<std::uint32_t>(draw));
    draw_high_.put(lane, static_cast<std::uint32_t>(draw >> 32U));
  }

  /// The first 4 * parts words of `tick`, one after another.
  [[gnu::always_inline]] inline void draw(const W& tick, unsigned parts, W* to) const noexcept {
    constexpr auto chance = static_cast<std::uint32_t>(stub::Chance::sensors) << 24U;
    const Product<N> a1 = product(tick, kPhiloxFirst);
    const Product<N> b1 = product(draw_low_, kPhiloxSecond);
    const W part_base = b1.high ^ key_[0][0] ^ W(chance);
    const W c2 = a1.high ^ draw_high_ ^ key_[0][1];
    const Product<N> b2 = product(c2, kPhiloxSecond);
    const W c0 = b2.high ^ b1.low ^ key_[1][0];
    const Product<N> a3 = product(c0, kPhiloxFirst);
    const W rest2 = a1.low ^ key_[1][1];
    const W rest3 = b2.low ^ key_[2][0];
    for (unsigned part = 0; part < parts; ++part) {
      const Product<N> a2 = product(part_base ^ W(part), kPhiloxFirst);
      const Product<N> b3 = product(a2.high ^ rest2, kPhiloxSecond);
      W c[4] = {b3.high ^ rest3, b3.low, a3.high ^ a2.low ^ key_[2][1], a3.low};
#pragma GCC unroll 10
      for (unsigned round = 3; round < kPhiloxRounds; ++round) {
        const Product<N> a = product(c[0], kPhiloxFirst);
        const Product<N> b = product(c[2], kPhiloxSecond);
        c[0] = b.high ^ c[1] ^ key_[round][0];
        c[1] = b.low;
        c[2] = a.high ^ c[3] ^ key_[round][1];
        c[3] = a.low;
      }
      for (unsigned k = 0; k < 4; ++k) *to++ = c[k];
    }
  }

 private:
  W key_[kPhiloxRounds][2]{};
  W draw_low_{0};
  W draw_high_{0};
};

}  // namespace pastern::packed::PASTERN_LANES_SET
