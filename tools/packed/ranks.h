// Many machines: the ranks of one mpirun, each of which does its share of the walks; afterwards all have all
// results, and go on alike. A process that was started alone is rank 0 of 1 and needs no MPI.
#pragma once

#include <cstddef>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "tools/packed/instruction_set.h"

namespace pastern::packed {

/// One object a process, made and used by one thread. Every rank must make the same calls in the same order.
class Ranks {
 public:
  /// Joins the ranks that mpirun started, or is alone when none did. Null with a line in `error` when they
  /// cannot be joined.
  [[nodiscard]] static std::unique_ptr<Ranks> join(std::string& error);
  /// Leaves. When it is destroyed by an exception all ranks are ended, since the others would wait for ever.
  ~Ranks();
  Ranks(const Ranks&) = delete;
  Ranks& operator=(const Ranks&) = delete;

  [[nodiscard]] int rank() const;
  [[nodiscard]] int count() const;
  /// The one that speaks and writes files.
  [[nodiscard]] bool leads() const { return rank() == 0; }

  /// Row i of `width` numbers has been filled by rank owner[i]; afterwards by all, bit for bit. The owners
  /// are the same on all ranks. Throws std::runtime_error when MPI fails.
  void gather(const std::vector<int>& owner, std::size_t width, double* numbers) const;
  /// Whether all ranks hold the same text, such as digests of robot, policy and seed: different files on
  /// different machines would otherwise give results that belong to nothing.
  [[nodiscard]] bool agree(std::string_view text) const;
  /// Whether it is so on any rank: what one decides, all do.
  [[nodiscard]] bool any(bool here) const;
  /// The narrowest of what the ranks have: the same bits everywhere need the same instructions everywhere.
  [[nodiscard]] InstructionSet common_set(InstructionSet own) const;

 private:
  struct Impl;
  explicit Ranks(std::unique_ptr<Impl> impl);
  [[nodiscard]] std::vector<std::vector<unsigned char>> all(const void* mine, std::size_t bytes) const;

  std::unique_ptr<Impl> impl_;
};

}  // namespace pastern::packed
