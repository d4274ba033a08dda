// See synthetic.h. Every number here is invented.
#include "tests/tools/synthetic.h"

#include <stdlib.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <random>

#include "proto/files/policy_file.h"
#include "proto/files/sha256.h"
#include "runtime/adapt/confirm.h"
#include "runtime/journal/journal.h"

namespace pastern::testing {
namespace {

class Writer {
 public:
  Writer(journal::Journal& journal, std::uint64_t session, bool even)
      : journal_(journal), session_(session), spread_(even ? 0 : 0.22) {}

  bool walk(v1::Part part, std::uint32_t batch, double level, const Parameters& parameters,
            v1::Outcome outcome, const std::string& void_reason = "") {
    v1::Episode episode;
    episode.set_session(session_);
    episode.set_walk(++walk_);
    episode.set_part(part);
    episode.set_batch(batch);
    episode.set_draw(walk_);
    episode.set_outcome(outcome);
    episode.set_void_reason(void_reason);
    fill(episode, level + spread_ * normal_(random_));
    std::string why;
    last_total_ = episode.terms().total();
    return journal_.commit(episode, parameters, "", why).has_value();
  }
  [[nodiscard]] double last_total() const { return last_total_; }

 private:
  void fill(v1::Episode& episode, double level) {
    const bool fell = episode.outcome() == v1::FELL;
    const double seconds = fell ? 1.8 : 5.0;
    v1::ReturnTerms& terms = *episode.mutable_terms();
    terms.set_energy(-0.35 * seconds / 5);
    terms.set_drift(-0.08);
    terms.set_turn(-0.03);
    terms.set_fall(fell ? -1.0 : 0.0);
    terms.set_forward((level + 0.46) * seconds / 5);
    terms.set_total(terms.forward() + terms.energy() + terms.drift() + terms.turn() + terms.fall());
    const double done = static_cast<double>(walk_);
    v1::EpisodeSummary& summary = *episode.mutable_summary();
    summary.set_duration_s(seconds);
    summary.set_distance_m(terms.forward());
    summary.set_mean_speed_m_per_s(terms.forward() / seconds);
    summary.set_moved_forward(true);
    summary.set_cost_of_transport(0.9 - 0.1 * level);
    summary.set_roll_rms_rad(0.14 - 0.03 * level);
    summary.set_pitch_rms_rad(0.08 - 0.01 * level);
    summary.set_roll_max_rad(fell ? 0.7 : 0.3 - 0.05 * level);
    summary.set_pitch_max_rad(0.2 - 0.02 * level);
    summary.set_winding_max_c(24 + 40 * (1 - std::exp(-done / 25)) + normal_(random_));
    summary.set_pack_min_v(34 - 0.03 * done + 0.1 * normal_(random_));
    trace(episode, level, seconds);
    if (!fell) return;
    v1::TripRecord& trip = *episode.mutable_trip();
    trip.set_cause("roll");
    trip.set_value(0.93);
    trip.set_limit(0.9);
    trip.set_unit("rad");
    trip.set_tick(18250);
    trip.set_reaction("ramp_down");
  }

  void trace(v1::Episode& episode, double level, double seconds) {
    const double lean = 0.12 - 0.03 * level;
    const double aside = 0.05 * normal_(random_) - (episode.part() == v1::CONFIRMATION_ADAPTED ? 0.0 : 0.05);
    for (double t = 0; t < seconds; t += 0.02) {
      v1::Trace& trace = *episode.mutable_trace();
      trace.add_time_s(static_cast<float>(t));
      trace.add_x_m(static_cast<float>(episode.summary().mean_speed_m_per_s() * t));
      trace.add_y_m(static_cast<float>(aside * t + 0.01 * std::sin(31 * t)));
      const double over = episode.outcome() == v1::FELL && t > 1.4 ? 3 * (t - 1.4) : 0;
      trace.add_roll_rad(static_cast<float>(lean * 0.4 + lean * std::sin(15.7 * t) + over));
      trace.add_pitch_rad(static_cast<float>(0.02 + 0.5 * lean * std::cos(31.4 * t)));
      trace.add_speed_m_per_s(static_cast<float>(episode.summary().mean_speed_m_per_s()));
    }
  }

  journal::Journal& journal_;
  std::uint64_t session_;
  double spread_;
  std::uint64_t walk_{0};
  double last_total_{0};
  std::mt19937_64 random_{7};
  std::normal_distribution<double> normal_{0, 1};
};

Parameters moved(const Parameters& start, double by) {
  Parameters to = start;
  for (std::size_t i = 0; i < to.size(); i += 3) to[i] += by * (i % 2 == 0 ? 1 : -0.4);
  return to;
}

v1::Outcome outcome_of(std::size_t number) {
  return number == 9 ? v1::VOID : number == 14 ? v1::FELL : number == 20 ? v1::LEFT_LANE : v1::COMPLETED;
}

bool search(Writer& writer, const Story& story, const Parameters& start) {
  bool good = true;
  for (std::size_t i = 0; i < story.search_walks; ++i) {
    const std::size_t number = 6 + i;
    const double progress = static_cast<double>(i) / static_cast<double>(story.search_walks);
    const v1::Outcome outcome = outcome_of(number);
    good = good && writer.walk(v1::SEARCH, static_cast<std::uint32_t>(i / 10), 2.4 + story.gain * progress,
                               moved(start, 0.001 * static_cast<double>(i)), outcome,
                               outcome == v1::VOID ? story.void_reason : "");
  }
  return good;
}

bool confirm(Writer& writer, const Story& story, const Parameters& start, const Parameters& adapted,
             v1::Verdict& verdict) {
  std::vector<double> differences;
  for (std::uint32_t pair = 0; pair < story.pairs; ++pair) {
    if (!writer.walk(v1::CONFIRMATION_START, pair, 2.35, start, v1::COMPLETED)) return false;
    const double before = writer.last_total();
    if (!writer.walk(v1::CONFIRMATION_ADAPTED, pair, 2.35 + story.gain, adapted, v1::COMPLETED)) return false;
    differences.push_back(writer.last_total() - before);
  }
  const adapt::Interval interval = adapt::sign_flip_interval(differences, 0.9);
  double sum = 0;
  for (const double difference : differences) sum += difference;
  verdict.set_p_value(adapt::sign_flip_p(differences));
  verdict.set_level(0.05);
  verdict.set_pairs(static_cast<std::uint32_t>(differences.size()));
  verdict.set_effect(sum / static_cast<double>(differences.size()));
  verdict.set_effect_low(interval.low);
  verdict.set_effect_high(interval.high);
  verdict.set_interval_level(0.9);
  verdict.set_kind(verdict.p_value() <= 0.05 ? v1::Verdict::ADOPT : v1::Verdict::KEEP);
  verdict.set_rule("confirmation: exact one-sided sign-flip test");
  return true;
}

}  // namespace

v1::Policy small_policy() {
  v1::Policy policy;
  policy.set_format(1);
  policy.set_name("invented");
  policy.set_robot("tern8");
  policy.set_scalar(v1::Policy::DOUBLE);
  policy.set_rate_hz(50);
  policy.set_gait_hz(2.5);
  for (const auto kind : {v1::Channel::ONE, v1::Channel::ROLL, v1::Channel::PITCH, v1::Channel::ROLL_RATE,
                          v1::Channel::PHASE_SIN, v1::Channel::PHASE_COS}) {
    v1::Channel& channel = *policy.add_channels();
    channel.set_kind(kind);
    channel.set_scale(1);
  }
  for (const char* name : {"front_left", "front_right", "rear_left", "rear_right"}) {
    v1::LegAction& leg = *policy.add_legs();
    leg.set_leg(name);
    leg.set_angle_rad(0.4);
    leg.set_length_m(0.1);
  }
  v1::Layer& layer = *policy.add_layers();
  layer.set_outputs(8);
  layer.set_inputs(6);
  layer.set_activation(v1::Layer::IDENTITY);
  for (int i = 0; i < 48; ++i) policy.add_parameters(0.3 * std::sin(1.7 * i));
  for (const auto& [name, first] : {std::pair{"front", 0U}, std::pair{"rear", 24U}}) {
    v1::ParameterGroup& group = *policy.add_groups();
    group.set_name(name);
    group.set_first(first);
    group.set_count(24);
    group.set_perturbation_scale(0.04);
  }
  policy.mutable_provenance()->set_text("invented for a test");
  return policy;
}

bool write_session(const std::string& folder, const Story& story) {
  std::string error;
  const auto journal = journal::Journal::open(folder, error);
  if (!journal) return false;
  v1::Policy policy = small_policy();
  const Parameters start(policy.parameters().begin(), policy.parameters().end());
  const Parameters adapted = moved(start, 0.05);
  const std::string start_bytes = files::pack_policy(policy);
  for (std::size_t i = 0; i < adapted.size(); ++i) policy.set_parameters(static_cast<int>(i), adapted[i]);
  const std::string adapted_bytes = files::pack_policy(policy);
  const std::string start_hash = files::hex(files::sha256(start_bytes));
  const files::Sha256 adapted_hash = files::sha256(adapted_bytes);
  journal::SessionRow row;
  row.plan_text =
      "name: \"default\"\nadaptation { kind: ES_GRADIENT }\nseed: 1\nwalk_s: 5\nbaseline_walks: 5\n"
      "search_walks: 50\nconfirmation_pairs: 8\nconfirmation_level: 0.05\nmax_falls: 5\n"
      "max_minutes: 60\nmax_void_repeats: 3\ngo_by: AUTO\n";
  row.robot_sha256_hex = std::string(64, 'a');
  row.start_policy_sha256_hex = start_hash;
  row.start_parameters_sha256_hex = files::hex(journal::parameters_sha256(start));
  row.software = "pastern-onboard 0.1.0";
  if (!journal->store_policy(start_bytes, start_hash).ok) return false;
  if (!journal->store_policy(adapted_bytes, files::hex(adapted_hash)).ok) return false;
  if (!journal->begin_session(row).ok) return false;
  Writer writer(*journal, row.session, story.even);
  bool good = true;
  for (int i = 0; i < 5; ++i) good = good && writer.walk(v1::BASELINE, 0, 2.4, start, v1::COMPLETED);
  good = good && search(writer, story, start);
  v1::Verdict verdict;
  verdict.set_kind(v1::Verdict::KEEP);
  verdict.set_words("keep the start policy: ended by the operator");
  if (story.confirm) {
    good = good && confirm(writer, story, start, adapted, verdict);
    verdict.set_adapted_sha256(files::raw(adapted_hash));
    verdict.set_words("words of the robot");
  }
  if (!journal->note(row.session, "waited 42 s for heat").ok) return false;
  return good && (!story.end || journal->end_session(row.session, verdict).ok);
}

Folder::Folder() {
  std::string pattern = (std::filesystem::temp_directory_path() / "pastern-test-XXXXXX").string();
  if (mkdtemp(pattern.data()) != nullptr) path_ = pattern;
}

Folder::~Folder() {
  std::error_code error;
  if (!path_.empty()) std::filesystem::remove_all(path_, error);
}

}  // namespace pastern::testing
