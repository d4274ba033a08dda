// What an operator has been told of its present batch: each place once, the worst for what is not finite.
#pragma once

#include <cstdint>
#include <optional>
#include <vector>

#include "runtime/types/episode.h"

namespace pastern::adapt {

using Told = std::vector<std::optional<double>>;

/// Enters the return; false (nothing changed) when the walk is void, of another batch, or was told before.
/// A return that is not finite becomes minus infinity: worse than any walk, equal to none but its like.
[[nodiscard]] bool accept(const Evaluation& evaluation, std::uint32_t batch, Told& told);
[[nodiscard]] bool complete(const Told& told);

}  // namespace pastern::adapt
