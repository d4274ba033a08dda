// Who may command, and until when.
#include "runtime/link/baton.h"

namespace pastern::link {

std::uint64_t Baton::take(const std::string& key, const std::string& who, std::int64_t now_ns) {
  if (held_) return 0;
  held_ = true;
  number_ = next_++;
  last_sign_ns_ = now_ns;
  key_ = key;
  who_ = who;
  return number_;
}

bool Baton::held_by(std::uint64_t number, const std::string& key) const {
  return held_ && number == number_ && key == key_;
}

bool Baton::renew(std::uint64_t number, const std::string& key, std::int64_t now_ns) {
  if (!held_by(number, key)) return false;
  last_sign_ns_ = now_ns;
  return true;
}

void Baton::drop() {
  held_ = false;
  key_.clear();
  who_.clear();
}

bool Baton::lapsed(std::int64_t now_ns) {
  if (!held_ || now_ns <= deadline_ns()) return false;
  drop();
  return true;
}

std::string Baton::why_not(std::uint64_t number) const {
  const std::string held = held_ ? who_ + " holds the baton" : std::string("nobody holds the baton");
  if (number == 0) return "this command needs the baton; " + held;
  if (number == number_ && held_)
    return "baton " + std::to_string(number) + " was taken with another key; " + held;
  return "baton " + std::to_string(number) + " is stale; " + held;
}

}  // namespace pastern::link
