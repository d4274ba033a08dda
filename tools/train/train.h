// `pastern train` as a function: a start policy from nothing, for a robot file. Interrupted at any moment it
// goes on from its last look; the policy file is the same, byte for byte, whatever the number of threads and
// interruptions.
#pragma once

#include <functional>
#include <string>

#include "proto/files/defect.h"
#include "proto/files/policy_file.h"
#include "tools/packed/ranks.h"
#include "tools/train/trainer.h"

namespace pastern::tools {

/// Settings that shipped policies are made with.
[[nodiscard]] TrainerSettings start_policy_settings();

struct TrainOptions {
  std::string robot;     ///< path of the robot file
  std::string out;       ///< path of the policy file to write
  std::string training;  ///< path of the resumable state; empty: `out` + ".training"
  std::string name;      ///< of the policy; empty: the robot's name + "_start"
  TrainerSettings settings{start_policy_settings()};
  unsigned threads{0};  ///< 0: all
  /// Walks run with these; the policy file belongs to them: others round otherwise.
  packed::InstructionSet instructions{packed::widest_set()};
  double walk_s{5};
  std::size_t last_look_walks{1000};  ///< of the judgement at the end, over the wide range
  std::string software;               ///< written into the provenance
  /// All ranks train alike and share the walks; the one that leads writes. Null: alone.
  const packed::Ranks* ranks{nullptr};
};

/// What is told while it runs.
struct TrainProgress {
  std::uint32_t iteration{0};
  std::uint32_t iterations{0};
  std::uint64_t walks{0};
  const v1::TrainingLook* look{nullptr};  ///< the newest, when there is a new one
  bool resumed{false};                    ///< the first report of a training that goes on
};

struct TrainResult {
  bool finished{false};  ///< the policy file is written
  std::uint64_t walks{0};
  Look wide;               ///< over the wide range, on lots that training never met
  Look nominal;            ///< on the nominal site
  std::string sha256_hex;  ///< of the policy file
};

/// `progress` is called after every iteration on the calling thread; false from it stops the training, which
/// is then saved. Wrong files, a training file of other settings, a full disk: `defects`, and nothing
/// half-written. On several ranks what ends one ends all.
[[nodiscard]] TrainResult run_train(const TrainOptions& options,
                                    const std::function<bool(const TrainProgress&)>& progress,
                                    files::Defects& defects);

}  // namespace pastern::tools
