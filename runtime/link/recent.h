// The ids of recent commands and what was answered: a repeated id gets the first answer and does nothing.
// Bounded: the oldest is forgotten (the journal remembers for ever). Used by the link thread only.
#pragma once

#include <cstdint>
#include <deque>
#include <string>
#include <unordered_map>
#include <vector>

#include "pastern/v1/link.pb.h"

namespace pastern::link {

/// The way back to whoever asked: the ROUTER's routing id, and whether an empty frame stood before the
/// message (REQ sockets send one and want one).
struct Route {
  std::string id;
  bool delimited{false};
  bool operator==(const Route&) const = default;
};

struct Asked {
  std::size_t digest{0};  ///< of the command's bytes: the same id with other bytes is another command
  std::uint64_t ticket{0};
  bool answered{false};
  v1::Answer answer;
  std::vector<Route> waiting;  ///< at most kMostWaiting, the newest; empty once answered
};

class Recent {
 public:
  static constexpr std::size_t kMostWaiting = 4;

  explicit Recent(std::size_t capacity) : capacity_(capacity) {}

  /// Null when not known (any more).
  [[nodiscard]] Asked* find(const std::string& id);
  /// Forgets the oldest when full. The reference holds until the next call of remember().
  Asked& remember(const std::string& id, std::size_t digest);

 private:
  std::size_t capacity_;
  std::unordered_map<std::string, Asked> entries_;
  std::deque<std::string> order_;
};

/// Adds a way back unless it is known; the oldest goes when there are too many.
void wait_at(Asked& asked, const Route& route);

}  // namespace pastern::link
