// Many walks: trials go to the lanes of each core as these get free, and to the ranks of an mpirun. The
// scores are the same to the bit for any number of threads and ranks and any order of the trials; another set
// of instructions rounds otherwise.
#pragma once

#include <map>
#include <memory>
#include <span>
#include <vector>

#include "tools/packed/ranks.h"
#include "tools/packed/walk.h"
#include "tools/train/trials.h"
#include "tools/train/walk.h"

namespace pastern::packed {

/// The parameters must stay until run() is back.
using tools::Trial;

struct FleetOptions {
  unsigned threads{0};  ///< 0: all of the machine
  InstructionSet set{widest_set()};
  Numbers numbers{Numbers::single};
};

/// Used by one thread; starts its own. Not copied.
class Fleet {
 public:
  /// `ranks`, where given, must outlive it: every rank then makes the same calls, with the same trials, and
  /// all run with the narrowest set of any. `choose` is called by several threads at once.
  Fleet(std::shared_ptr<const WalkSettings> settings, tools::SiteChoice choose, const FleetOptions& options,
        const Ranks* ranks = nullptr);
  ~Fleet();
  Fleet(const Fleet&) = delete;
  Fleet& operator=(const Fleet&) = delete;

  /// scores[i] of trials[i]. Robots of a lot stand up once, also from call to call while there is room.
  /// Throws what `choose` throws, and std::invalid_argument for lists or parameters of a wrong size; then
  /// nothing has been said of the scores.
  void run(std::span<const Trial> trials, std::span<tools::Score> scores);

  [[nodiscard]] InstructionSet set() const { return set_; }

 private:
  struct LotOrder {
    bool operator()(const tools::Lot& a, const tools::Lot& b) const {
      return a.seed != b.seed ? a.seed < b.seed : a.number < b.number;
    }
  };
  using StoodByLot = std::map<tools::Lot, Stood, LotOrder>;
  class Stands;
  class Walks;
  struct Plan;

  void check(std::span<const Trial> trials, std::span<tools::Score> scores) const;
  [[nodiscard]] Plan plan(std::span<const Trial> trials) const;
  void stand_up(const Plan& plan);
  void stand_up(const std::vector<tools::Lot>& lots);
  void walk(const Plan& plan, std::span<const Trial> trials, std::span<tools::Score> scores);
  void share(const Plan& plan, std::span<tools::Score> scores) const;

  std::shared_ptr<const WalkSettings> settings_;
  tools::SiteChoice choose_;
  const Ranks* ranks_;
  InstructionSet set_;
  std::vector<std::unique_ptr<Walker>> walkers_;  // one a thread
  StoodByLot stood_;
};

}  // namespace pastern::packed
