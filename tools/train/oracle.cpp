// A trainer on one site, and a judgement with common lots.
#include "tools/train/oracle.h"

#include "tools/train/draws.h"

namespace pastern::tools {

Gap find_gap(const WalkCourse& site, const Parameters& start, const OracleSettings& settings,
             unsigned threads) {
  TrainerSettings training;
  training.seed = Draws(settings.seed, Purpose::oracle, 0).word64();
  training.iterations = settings.iterations;
  training.directions = settings.directions;
  training.sigma = settings.sigma;
  training.step = training.last_step = settings.step;
  training.look_every = settings.look_every;
  training.look_walks = settings.look_walks;
  Trainer trainer(training, start, site.by_lanes(threads));
  while (trainer.step()) {
  }
  const auto trials = site.by_lanes(threads);
  const std::uint64_t judging = Draws(settings.seed, Purpose::oracle, 1).word64();
  Gap gap;
  gap.parameters = trainer.best();
  gap.start = look_at(*trials, start, judging, 0, settings.judging_walks);
  gap.oracle = look_at(*trials, gap.parameters, judging, 0, settings.judging_walks);
  return gap;
}

}  // namespace pastern::tools
