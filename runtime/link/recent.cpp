// The ids of recent commands and what was answered.
#include "runtime/link/recent.h"

#include <algorithm>

namespace pastern::link {
namespace {

// A public key never holds a newline (Z85), so two different pairs never give one name.
std::string joined(const std::string& key, const std::string& id) { return key + '\n' + id; }

}  // namespace

Asked* Recent::find(const std::string& key, const std::string& id) {
  const auto found = entries_.find(joined(key, id));
  return found == entries_.end() ? nullptr : &found->second;
}

Asked& Recent::remember(const std::string& key, const std::string& id, std::size_t digest) {
  const std::string name = joined(key, id);
  while (order_.size() >= capacity_) {
    entries_.erase(order_.front());
    order_.pop_front();
  }
  order_.push_back(name);
  Asked& asked = entries_[name];
  asked = Asked{};
  asked.digest = digest;
  return asked;
}

void Recent::forget(const std::string& key, const std::string& id) {
  const std::string name = joined(key, id);
  if (entries_.erase(name) == 0) return;
  // What is forgotten on purpose is nearly always the newest.
  const auto last = std::find(order_.rbegin(), order_.rend(), name);
  if (last != order_.rend()) order_.erase(std::next(last).base());
}

void wait_at(Asked& asked, const Route& route) {
  if (std::find(asked.waiting.begin(), asked.waiting.end(), route) != asked.waiting.end()) return;
  if (asked.waiting.size() >= Recent::kMostWaiting) asked.waiting.erase(asked.waiting.begin());
  asked.waiting.push_back(route);
}

}  // namespace pastern::link
