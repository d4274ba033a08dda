// What a report tells, gathered from a journal: plain values, no words, no layout.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/plan.pb.h"
#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "runtime/journal/journal.h"

namespace pastern::tools {

/// Two walks that belong together, start and adapted policy.
struct Pair {
  std::uint32_t number{0};  ///< 1, 2, 3 ...
  double start{0};
  double adapted{0};
  bool adapted_first{false};
};

/// Means over some walks; angles in rad.
struct Means {
  std::size_t walks{0};
  std::size_t falls{0};
  std::size_t left_lane{0};
  v1::ReturnTerms terms;
  double speed_m_per_s{0};
  double distance_m{0};
  double roll_rms_rad{0}, pitch_rms_rad{0};
  double roll_max_rad{0}, pitch_max_rad{0};  ///< means of the walks' greatest
  double aside_m{0};                         ///< mean |y| at the end of the walk, from the traces
  double cost_of_transport{0};               ///< over the walks that moved forward
  double spread{0};                          ///< standard deviation of the return (n - 1); 0 below two walks
};
[[nodiscard]] Means means_of(const std::vector<const v1::Episode*>& walks);

struct Facts {
  std::string source;
  journal::SessionRow row;
  std::string begun;      ///< when, on what, by whom; empty in a record that does not say
  bool simulated{false};  ///< as `begun` says
  std::string drives;     ///< what the plug-in calls itself; empty in a record that does not say
  std::string drives_settings;
  std::string digest;
  std::optional<v1::Plan> plan;
  std::optional<v1::Verdict> verdict;
  std::vector<v1::Episode> walks;  ///< all, voids included, in order
  std::vector<std::string> notes;
  std::vector<journal::Adoption> adoptions;
  std::optional<v1::Policy> start;
  Parameters start_parameters;
  Parameters adapted_parameters;  ///< empty when nothing was proposed
  std::string adapted_sha256_hex;
  std::optional<v1::Robot> robot;  ///< when its file was given: lane, name

  /// Walks of a part that count; `before` and `after` are what the report compares.
  [[nodiscard]] std::vector<const v1::Episode*> counted(v1::Part part) const;
  [[nodiscard]] std::vector<const v1::Episode*> before()
      const;  ///< confirmation's start walks, else baseline
  [[nodiscard]] std::vector<const v1::Episode*> after()
      const;  ///< confirmation's adapted walks; may be empty
  [[nodiscard]] std::vector<Pair> pairs() const;
  [[nodiscard]] std::size_t count(v1::Outcome outcome) const;
};

/// `session` 0: the last one that has walks or was begun. Nothing with one line in `why` when it is not
/// there.
[[nodiscard]] std::optional<Facts> gather(const journal::Journal& journal, std::uint64_t session,
                                          std::string& why);

}  // namespace pastern::tools
