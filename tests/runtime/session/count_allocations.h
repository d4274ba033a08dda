// Counts what operator new is asked for, in every thread. Linked into tests that forbid allocation.
#pragma once

#include <cstdint>

namespace pastern::test {
[[nodiscard]] std::uint64_t allocations();
}
