// Words in blocks of four; the counter's first word is the place of the block.
#include "tools/train/draws.h"

#include <Random123/philox.h>

#include <cmath>
#include <numbers>

namespace pastern::tools {

Draws::Draws(std::uint64_t seed, Purpose purpose, std::uint64_t index) noexcept
    : key_{static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32U)},
      counter_{0, static_cast<std::uint32_t>(purpose), static_cast<std::uint32_t>(index),
               static_cast<std::uint32_t>(index >> 32U)} {}

std::uint32_t Draws::word() noexcept {
  if (left_ == 0) {
    const r123::Philox4x32::ctr_type counter = {{counter_[0], counter_[1], counter_[2], counter_[3]}};
    const r123::Philox4x32::key_type key = {{key_[0], key_[1]}};
    const auto block = r123::Philox4x32()(counter, key);
    for (std::size_t i = 0; i < 4; ++i) words_[i] = block[i];
    ++counter_[0];
    left_ = 4;
  }
  return words_[4 - left_--];
}

std::uint64_t Draws::word64() noexcept {
  const std::uint64_t low = word();
  return low | (static_cast<std::uint64_t>(word()) << 32U);
}

double Draws::uniform() noexcept { return (static_cast<double>(word()) + 0.5) * 0x1p-32; }

double Draws::normal() noexcept {
  const double radius = std::sqrt(-2 * std::log(uniform()));
  return radius * std::cos(2 * std::numbers::pi * uniform());
}

}  // namespace pastern::tools
