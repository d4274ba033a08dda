// Iterations and looks. Every walk's result goes to a place of its own and is summed in index order.
#include "tools/train/trainer.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "proto/files/words.h"
#include "tools/train/draws.h"
#include "tools/train/pool.h"

namespace pastern::tools {
namespace {

constexpr std::uint32_t kFormat = 1;

double total(const Score& score) { return score.terms.total(); }

// Lots of looks never meet those of iterations: another seed, drawn from the first.
std::uint64_t look_seed(std::uint64_t seed) { return Draws(seed, Purpose::look, 0).word64(); }

bool finite(const google::protobuf::RepeatedField<double>& values) {
  return std::all_of(values.begin(), values.end(), [](double value) { return std::isfinite(value); });
}

void put(const Parameters& from, google::protobuf::RepeatedField<double>& to) {
  to.Clear();
  to.Add(from.begin(), from.end());
}

}  // namespace

std::string TrainerSettings::text() const {
  using files::shown_number;
  return "seed " + std::to_string(seed) + ", iterations " + std::to_string(iterations) + ", directions " +
         std::to_string(directions) + ", sigma " + shown_number(sigma) + ", step " + shown_number(step) +
         " to " + shown_number(last_step) + ", a look of " + std::to_string(look_walks) + " walks every " +
         std::to_string(look_every) + " iterations, fall penalty " + shown_number(fall_penalty);
}

namespace {

std::vector<Trial> looks(const Parameters& parameters, std::uint64_t seed, std::uint64_t first,
                         std::size_t walks) {
  std::vector<Trial> wanted;
  for (std::size_t i = 0; i < walks; ++i) wanted.push_back({&parameters, {seed, first + i}});
  return wanted;
}

Look seen(const std::vector<Score>& scores, double duration_s) {
  Look look;
  look.walks = scores.size();
  const auto n = static_cast<double>(std::max<std::size_t>(1, scores.size()));
  for (const Score& score : scores) {
    look.mean_return += total(score) / n;
    look.falls += score.fell ? 1 : 0;
    look.speed_m_per_s += score.distance_m / duration_s / n;
  }
  look.falls /= n;  // once, so that 10 of 1 000 are 1 % and no more
  double square = 0;
  for (const Score& score : scores)
    square += (total(score) - look.mean_return) * (total(score) - look.mean_return);
  look.return_error = std::sqrt(square / std::max(1.0, n - 1) / n);
  return look;
}

}  // namespace

Look look_at(Trials& trials, const Parameters& parameters, std::uint64_t seed, std::uint64_t first,
             std::size_t walks) {
  return seen(trials.run(looks(parameters, seed, first, walks)), trials.duration_s());
}

Look look_at(const std::vector<std::unique_ptr<Course>>& courses, const Parameters& parameters,
             std::uint64_t seed, std::uint64_t first, std::size_t walks) {
  return seen(run_on(courses, looks(parameters, seed, first, walks)), courses.front()->duration_s());
}

Trainer::Trainer(const TrainerSettings& settings, Parameters start,
                 std::vector<std::unique_ptr<Course>> courses)
    : Trainer(settings, std::move(start), trials_on(std::move(courses))) {}

Trainer::Trainer(const TrainerSettings& settings, Parameters start, std::unique_ptr<Trials> trials)
    : settings_(settings),
      trials_(std::move(trials)),
      centre_(std::move(start)),
      best_(centre_),
      best_score_(-std::numeric_limits<double>::infinity()) {}

bool Trainer::step() {
  if (done()) return false;
  climb();
  ++iteration_;
  if (iteration_ % settings_.look_every == 0 || done()) look();
  return true;
}

void Trainer::climb() {
  const std::size_t pairs = settings_.directions;
  std::vector<Parameters> directions(pairs, Parameters(centre_.size()));
  std::vector<Parameters> there(2 * pairs, centre_);
  std::vector<Trial> trials;
  for (std::size_t i = 0; i < pairs; ++i) {
    draw_direction(settings_.seed, iteration_, i, directions[i]);
    const Lot lot{settings_.seed, static_cast<std::uint64_t>(iteration_) * pairs + i};
    for (std::size_t k = 2 * i; k < 2 * i + 2; ++k) {
      const double sign = k % 2 == 0 ? 1 : -1;
      for (std::size_t j = 0; j < centre_.size(); ++j) {
        there[k][j] = centre_[j] + sign * settings_.sigma * directions[i][j];
      }
      trials.push_back({&there[k], lot});
    }
  }
  const std::vector<Score> scores = trials_->run(trials);
  std::vector<double> differences(pairs);
  for (std::size_t i = 0; i < pairs; ++i) {
    differences[i] = total(scores[2 * i]) - total(scores[2 * i + 1]);
  }
  const double share =
      settings_.iterations > 1 ? static_cast<double>(iteration_) / (settings_.iterations - 1) : 0;
  const double step = settings_.step + (settings_.last_step - settings_.step) * share;
  adam_.ascend(gradient_of(rank_weights(differences), directions), step, centre_);
  walks_ += 2 * pairs;
}

void Trainer::look() {
  const Look seen = look_at(*trials_, centre_, look_seed(settings_.seed), 0, settings_.look_walks);
  walks_ += settings_.look_walks;
  const double score = seen.mean_return - settings_.fall_penalty * seen.falls;
  if (score > best_score_) {
    best_score_ = score;
    best_ = centre_;
  }
  v1::TrainingLook line;
  line.set_iteration(iteration_);
  line.set_walks(walks_);
  line.set_mean_return(seen.mean_return);
  line.set_falls(seen.falls);
  line.set_speed_m_per_s(seen.speed_m_per_s);
  looks_.push_back(line);
}

void Trainer::save(v1::Training& training) const {
  training.set_format(kFormat);
  training.set_settings(settings_.text());
  training.set_iteration(iteration_);
  training.set_walks(walks_);
  put(centre_, *training.mutable_centre());
  put(adam_.mean, *training.mutable_mean());
  put(adam_.square, *training.mutable_square());
  put(best_, *training.mutable_best());
  training.set_best_score(best_score_);
  training.clear_looks();
  for (const v1::TrainingLook& line : looks_) *training.add_looks() = line;
}

bool Trainer::restore(const v1::Training& training, std::string& error) {
  const auto size = static_cast<int>(centre_.size());
  const bool begun = training.iteration() > 0;
  const int moments = begun ? size : 0;
  if (training.format() != kFormat) {
    error = "found format " + std::to_string(training.format()) + ", expected format 1";
  } else if (training.settings() != settings_.text()) {
    error = "found a training with " + training.settings() + ", expected " + settings_.text();
  } else if (training.centre_size() != size || training.best_size() != size ||
             training.mean_size() != moments || training.square_size() != moments) {
    error =
        "found " + std::to_string(training.centre_size()) + " parameters, expected " + std::to_string(size);
  } else if (!finite(training.centre()) || !finite(training.mean()) || !finite(training.square()) ||
             !finite(training.best()) || std::isnan(training.best_score())) {
    error = "found a number that is not finite, expected finite ones";
  } else if (training.iteration() > settings_.iterations) {
    error = "found iteration " + std::to_string(training.iteration()) + ", expected at most " +
            std::to_string(settings_.iterations);
  } else {
    centre_.assign(training.centre().begin(), training.centre().end());
    best_.assign(training.best().begin(), training.best().end());
    adam_.mean.assign(training.mean().begin(), training.mean().end());
    adam_.square.assign(training.square().begin(), training.square().end());
    adam_.steps = training.iteration();
    best_score_ = training.best_score();
    iteration_ = training.iteration();
    walks_ = training.walks();
    looks_.assign(training.looks().begin(), training.looks().end());
    return true;
  }
  return false;
}

}  // namespace pastern::tools
