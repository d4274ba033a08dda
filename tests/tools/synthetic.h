// A made-up session written through the real journal, so that the report can be tried without a robot.
#pragma once

#include <string>

#include "pastern/v1/episode.pb.h"
#include "pastern/v1/policy.pb.h"

namespace pastern::testing {

struct Story {
  std::size_t search_walks{50};
  std::size_t pairs{8};
  double gain{0.6};  ///< of the adapted policy over the start policy
  bool end{true};    ///< the session has a verdict
  bool confirm{true};
  bool even{false};  ///< without chance from walk to walk
  std::string void_reason{"somebody bumped it"};
};

/// A linear policy for a robot of four legs without abduction: 6 channels, 8 outputs, 48 parameters, two
/// groups.
[[nodiscard]] v1::Policy small_policy();

/// Writes a session into `folder`/pastern.journal: 5 baseline walks, the search, the pairs; walk 9 is void,
/// walk 14 falls, walk 20 leaves the lane. False when the journal refused.
[[nodiscard]] bool write_session(const std::string& folder, const Story& story);

/// A new empty folder that is removed when this object goes.
class Folder {
 public:
  Folder();
  ~Folder();
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  [[nodiscard]] const std::string& path() const { return path_; }

 private:
  std::string path_;
};

}  // namespace pastern::testing
