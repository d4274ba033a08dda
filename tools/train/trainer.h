// Makes a policy by antithetic evolution strategies over lots of a course. Resumable; the same bits for a
// seed whatever the number of threads.
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "pastern/v1/training.pb.h"
#include "tools/train/course.h"
#include "tools/train/evolution.h"
#include "tools/train/trials.h"

namespace pastern::tools {

struct TrainerSettings {
  std::uint64_t seed{1};
  std::uint32_t iterations{200};
  std::size_t directions{128};  ///< pairs of walks an iteration; each pair has a lot of its own
  double sigma{0.05};
  double step{0.01};             ///< of Adam, at the beginning
  double last_step{0.01};        ///< at the end; between them it goes down in a line
  std::uint32_t look_every{10};  ///< iterations between looks at the centre on lots of their own
  std::size_t look_walks{200};
  double fall_penalty{0};  ///< taken off a look's mean return for a share of 1 of falls

  /// All that the result depends on, in words.
  [[nodiscard]] std::string text() const;
};

/// Mean figures of a policy over lots.
struct Look {
  std::size_t walks{0};
  double mean_return{0};
  double return_error{0};  ///< standard error of the mean
  double falls{0};         ///< share
  double speed_m_per_s{0};
};

/// Walks of `parameters` over lots (seed, first .. first + walks - 1).
[[nodiscard]] Look look_at(Trials& trials, const Parameters& parameters, std::uint64_t seed,
                           std::uint64_t first, std::size_t walks);
/// The same with one course a thread.
[[nodiscard]] Look look_at(const std::vector<std::unique_ptr<Course>>& courses, const Parameters& parameters,
                           std::uint64_t seed, std::uint64_t first, std::size_t walks);

class Trainer {
 public:
  Trainer(const TrainerSettings& settings, Parameters start, std::unique_ptr<Trials> trials);
  /// On one course a thread.
  Trainer(const TrainerSettings& settings, Parameters start, std::vector<std::unique_ptr<Course>> courses);

  /// One iteration, and the look that belongs after it. False when all are done.
  bool step();
  [[nodiscard]] bool done() const { return iteration_ >= settings_.iterations; }
  [[nodiscard]] std::uint32_t iteration() const { return iteration_; }
  [[nodiscard]] std::uint64_t walks() const { return walks_; }
  [[nodiscard]] const Parameters& centre() const { return centre_; }
  /// Parameters of the best look; the start's before the first.
  [[nodiscard]] const Parameters& best() const { return best_; }
  [[nodiscard]] double best_score() const { return best_score_; }
  [[nodiscard]] const std::vector<v1::TrainingLook>& looks() const { return looks_; }

  /// All that varies; settings stand in it as text. The caller adds robot and policy.
  void save(v1::Training& training) const;
  /// False with a line in `error` when it belongs to other settings or another size, or holds what is not
  /// finite.
  [[nodiscard]] bool restore(const v1::Training& training, std::string& error);

 private:
  void climb();
  void look();

  TrainerSettings settings_;
  std::unique_ptr<Trials> trials_;
  Parameters centre_;
  Parameters best_;
  double best_score_;
  Adam adam_;
  std::uint32_t iteration_{0};
  std::uint64_t walks_{0};
  std::vector<v1::TrainingLook> looks_;
};

}  // namespace pastern::tools
