// The ids of recent commands and what was answered.
#include "runtime/link/recent.h"

#include <algorithm>

namespace pastern::link {

Asked* Recent::find(const std::string& id) {
  const auto found = entries_.find(id);
  return found == entries_.end() ? nullptr : &found->second;
}

Asked& Recent::remember(const std::string& id, std::size_t digest) {
  while (order_.size() >= capacity_) {
    entries_.erase(order_.front());
    order_.pop_front();
  }
  order_.push_back(id);
  Asked& asked = entries_[id];
  asked = Asked{};
  asked.digest = digest;
  return asked;
}

void wait_at(Asked& asked, const Route& route) {
  if (std::find(asked.waiting.begin(), asked.waiting.end(), route) != asked.waiting.end()) return;
  if (asked.waiting.size() >= Recent::kMostWaiting) asked.waiting.erase(asked.waiting.begin());
  asked.waiting.push_back(route);
}

}  // namespace pastern::link
