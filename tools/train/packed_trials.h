// Trials by lanes: 4 to 16 robots at once on each thread (tools/packed). The same walk as WalkCourse's within
// what single precision leaves of it; the scalar course stays the reference.
#pragma once

#include <memory>
#include <string>

#include "tools/packed/instruction_set.h"
#include "tools/packed/ranks.h"
#include "tools/train/trials.h"
#include "tools/train/walk.h"

namespace pastern::tools {

/// `set`: instructions that this machine has. Scores are the same to the bit
/// for any number of threads; another set of instructions rounds otherwise. Lots whose site has
/// faults, which lanes do not know, are walked one by one by a WalkCourse. With `ranks`, which must outlive
/// them, each rank walks its share (tools/packed/fleet.h); of lots with faults each rank walks all.
[[nodiscard]] std::unique_ptr<Trials> packed_trials(std::shared_ptr<const WalkSetting> setting,
                                                    SiteChoice choose, unsigned threads,
                                                    packed::InstructionSet set = packed::widest_set(),
                                                    const packed::Ranks* ranks = nullptr);

}  // namespace pastern::tools
