// Walks, states and verdicts in words. See follow.h.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "proto/files/sha256.h"
#include "tools/pastern/follow.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

constexpr double kDegree = 3.14159265358979323846 / 180.0;

std::string remark(const v1::Episode& episode) {
  if (episode.outcome() == v1::VOID) return "  void: " + episode.void_reason();
  return episode.has_trip() && !episode.trip().cause().empty() ? "  " + trip_words(episode.trip()) : "";
}

std::string angle(double rad) { return std::isfinite(rad) ? fmt::format("{:+.3f}", rad + 0.0) : "-"; }

/// A line a joint; empty before the robot was read.
std::string joints_text(const v1::Status& status) {
  if (status.joints().empty()) return "";
  Table table({"joint", "angle rad", "target rad", "winding C"});
  for (const v1::JointStatus& joint : status.joints()) {
    table.row({joint.name(), angle(joint.angle_rad()),
               joint.has_target_rad() ? angle(joint.target_rad()) : "-",
               std::isfinite(joint.winding_c()) ? fmt::format("{:.1f}", joint.winding_c() + 0.0) : "-"});
  }
  return table.text();
}

}  // namespace

bool walked(const v1::Episode& episode) { return episode.summary().duration_s() > 0; }

std::string words(v1::Part part) {
  switch (part) {
    case v1::BASELINE:
      return "baseline";
    case v1::SEARCH:
      return "search";
    case v1::CONFIRMATION_START:
      return "confirm, start";
    case v1::CONFIRMATION_ADAPTED:
      return "confirm, adapted";
    case v1::SINGLE:
      return "single";
    default:
      return "-";
  }
}

std::string words(v1::Outcome outcome) {
  switch (outcome) {
    case v1::COMPLETED:
      return "completed";
    case v1::FELL:
      return "FELL";
    case v1::LEFT_LANE:
      return "left the lane";
    case v1::VOID:
      return "void";
    default:
      return "-";
  }
}

std::string words(v1::RobotState state) {
  switch (state) {
    case v1::PARKED:
      return "parked, torque off";
    case v1::RISING:
      return "rising";
    case v1::READY:
      return "standing, ready";
    case v1::WALKING:
      return "walking";
    case v1::SETTLING:
      return "settling";
    case v1::LOWERING:
      return "lowering";
    case v1::TRIPPED:
      return "TRIPPED, latched";
    case v1::WAITING:
      return "waiting";
    default:
      return "not said";
  }
}

std::string words(v1::SessionPart part) {
  switch (part) {
    case v1::NO_SESSION:
      return "none";
    case v1::IN_BASELINE:
      return "baseline";
    case v1::IN_SEARCH:
      return "search";
    case v1::IN_CONFIRMATION:
      return "confirmation";
    case v1::ENDED:
      return "ended";
    case v1::INTERRUPTED:
      return "interrupted";
    default:
      return "not said";
  }
}

std::string walk_head() {
  return fmt::format("{:>4}  {:<16}  {:<13}  {:>6}  {:>5}  {:>5}  {:>5}  {:>5}  {:>5}", "walk", "part",
                     "outcome", "return", "m/s", "roll", "pitch", "hot C", "low V");
}

std::string walk_line(const v1::Episode& episode) {
  const v1::EpisodeSummary& summary = episode.summary();
  const std::string head =
      fmt::format("{:>4}  {:<16}  {:<13}", episode.walk(), words(episode.part()), words(episode.outcome()));
  if (!walked(episode)) return head + remark(episode);
  return head + fmt::format("  {:>6.2f}  {:>5.2f}  {:>5.1f}  {:>5.1f}  {:>5.0f}  {:>5.1f}{}",
                            episode.terms().total(), summary.mean_speed_m_per_s(),
                            summary.roll_rms_rad() / kDegree, summary.pitch_rms_rad() / kDegree,
                            std::round(summary.winding_max_c()) + 0.0, summary.pack_min_v(), remark(episode));
}

std::string verdict_line(const v1::Verdict& verdict) {
  const bool adopt = verdict.kind() == v1::Verdict::ADOPT;
  const std::string kind = verdict.kind() == v1::Verdict::KIND_NOT_SAID ? "none"
                           : adopt                                      ? "adopt"
                                                                        : "keep the start policy";
  return "verdict: " + (verdict.words().empty() ? kind : verdict.words());
}

std::string site_of(const std::string& settings) {
  static const std::string key = "scenario=";
  static const std::string suffix = ".scenario.txtpb";
  for (std::size_t at = 0; at < settings.size();) {
    const std::size_t end = std::min(settings.find(';', at), settings.size());
    const std::string part = settings.substr(at, end - at);
    at = end + 1;
    if (part.compare(0, key.size(), key) != 0) continue;
    const std::string name = part.substr(std::max(part.rfind('/') + 1, key.size()));
    const bool usual =
        name.size() > suffix.size() && name.compare(name.size() - suffix.size(), suffix.size(), suffix) == 0;
    return usual ? name.substr(0, name.size() - suffix.size()) : name;
  }
  return "";
}

std::string drives_words(bool simulated, const std::string& drives, const std::string& settings) {
  const std::string usual = simulated ? "simulated robot" : "real drives";
  const std::string named = drives.empty() || drives == usual ? usual : usual + " (" + drives + ")";
  if (!simulated) return named;
  const std::string site = site_of(settings);
  return named + ", " + (site.empty() ? "site not named in its settings" : "site " + site);
}

std::string status_text(const v1::Status& status) {
  std::string out;
  const auto fact = [&](const std::string& name, const std::string& value) {
    if (!value.empty()) out += fmt::format("{:<12}{}\n", name, value);
  };
  fact("robot", fmt::format("{}, {} pace; file sha256 {}", status.robot(), status.pace(),
                            brief_hash(status.robot_sha256_hex())));
  fact("drives", drives_words(status.simulated(), status.drives(), status.drives_settings()));
  fact("settings", status.drives_settings());
  fact("state", words(status.robot_state()));
  fact("waiting for", status.waiting_for());
  if (status.has_trip()) fact("trip", trip_words(status.trip()));
  fact("policy", "sha256 " + brief_hash(status.policy_sha256_hex()));
  const bool read = status.ticks() > 0;  // before the first tick no sensor has been read
  fact("pack", read
                   ? fmt::format("{:.1f} V, {:.1f} A", status.pack_voltage_v(), status.pack_current_a() + 0.0)
                   : "not read yet");
  fact("hottest",
       read ? fmt::format("{:.0f} deg C", std::round(status.winding_max_c()) + 0.0) : "not read yet");
  fact("baton", status.baton_holder().empty() ? "nobody holds it" : "held by " + status.baton_holder());
  if (status.session() != 0) {
    const std::string planned =
        status.walks_planned() == 0 ? "" : fmt::format(" of {}", status.walks_planned());
    fact("session",
         fmt::format("{}: {}; {}{} walks, {} falls, {} void", status.session(), words(status.session_part()),
                     status.walks_done(), planned, status.falls(), status.voids()));
    const auto known = [](double value) {
      return value == 0 ? std::string("-") : fmt::format("{:.2f}", value);
    };
    fact("return", fmt::format("start policy {}, best of the search {}", known(status.start_return()),
                               known(status.best_return())));
  } else {
    fact("session", "none");
  }
  if (status.has_verdict())
    fact("verdict", verdict_line(status.verdict()).substr(std::string("verdict: ").size()));
  fact("cycle", fmt::format("{} ticks, {} overruns{}", status.ticks(), status.overruns(),
                            status.scheduling().empty() ? "" : "; " + status.scheduling()));
  fact("software", status.software());
  return out + joints_text(status);
}

void Progress::update(std::uint64_t done, std::uint64_t planned, Clock::time_point now, bool waits) {
  if (!first_ || done < *first_) {
    first_ = done;
    active_s_ = per_walk_s_ = 0;
  } else if (!waited_) {
    active_s_ += std::chrono::duration<double>(now - last_).count();
  }
  last_ = now;
  waited_ = waits;
  if (done > *first_ && done > done_) per_walk_s_ = active_s_ / static_cast<double>(done - *first_);
  done_ = done;
  planned_ = planned;
}

std::optional<double> Progress::seconds_to_go() const {
  if (per_walk_s_ <= 0 || planned_ < done_) return std::nullopt;
  return per_walk_s_ * static_cast<double>(planned_ - done_);
}

std::string Progress::line() const {
  const std::optional<double> left = seconds_to_go();
  return fmt::format("{} {} of {} walks{}",
                     bar(static_cast<double>(done_), static_cast<double>(planned_), 30), done_, planned_,
                     left ? fmt::format(", about {} to go", duration(*left)) : "");
}

void suggest_after(const v1::Status& status) {
  const std::string& waiting = status.waiting_for();
  const bool ended = status.session_part() == v1::ENDED;
  if (status.robot_state() == v1::TRIPPED) {
    suggest("release", "clears the trip, once its cause is gone and nobody is in reach");
  } else if (waiting.find("first-start") != std::string::npos) {
    suggest("confirm", "first start with this robot file: read the procedure, then confirm");
  } else if (waiting == "go") {
    suggest("go", "when the robot is back on its mark and nobody is in reach");
  } else if (waiting == "baton") {
    suggest("resume", "takes the baton up again; the session goes on");
  } else if (status.session_part() == v1::INTERRUPTED) {
    suggest("resume", "goes on with the interrupted session");
  } else if (ended && status.verdict().kind() == v1::Verdict::ADOPT &&
             status.policy_sha256_hex() != files::hex(status.verdict().adapted_sha256())) {
    suggest("adopt", "makes the adapted policy current; `pastern report` first shows why");
  } else if (ended) {
    suggest("report --out report.html", "the session as one page");
  } else if (status.session_part() == v1::NO_SESSION) {
    suggest("start tools/plans/default.plan.txtpb", "begins a session");
  } else {
    suggest("watch", "follows the session");
  }
}

}  // namespace pastern::tools
