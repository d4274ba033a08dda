// Who may command, and until when. Plain values: the time is handed in (CLOCK_MONOTONIC, ns), so that it can
// be tested without waiting. Used by the link thread only.
#pragma once

#include <cstdint>
#include <string>

namespace pastern::link {

class Baton {
 public:
  /// Numbers rise from `first`, which the server draws at random: a number from before a restart is stale.
  Baton(std::uint64_t first, std::int64_t lapse_ns) : next_(first), lapse_ns_(lapse_ns) {}

  /// The new number, or 0 while somebody holds it. `key` is the sender's public key (empty without keys).
  [[nodiscard]] std::uint64_t take(const std::string& key, const std::string& who, std::int64_t now_ns);
  /// True for the number and the key that hold it: a number overheard or guessed is of no use to another key.
  [[nodiscard]] bool held_by(std::uint64_t number, const std::string& key) const;
  /// A sign of life; false when it is not theirs.
  [[nodiscard]] bool renew(std::uint64_t number, const std::string& key, std::int64_t now_ns);
  void drop();
  /// True when it was held and the last sign of life is older than the lapse; it is dropped then.
  [[nodiscard]] bool lapsed(std::int64_t now_ns);

  [[nodiscard]] bool held() const { return held_; }
  [[nodiscard]] std::uint64_t number() const { return held_ ? number_ : 0; }
  [[nodiscard]] const std::string& key() const { return key_; }
  /// Empty when nobody holds it.
  [[nodiscard]] const std::string& holder() const { return who_; }
  /// When it lapses without a further sign of life.
  [[nodiscard]] std::int64_t deadline_ns() const { return last_sign_ns_ + lapse_ns_; }

  /// Why `number` does not command: one line for people.
  [[nodiscard]] std::string why_not(std::uint64_t number) const;

 private:
  std::uint64_t next_;
  std::int64_t lapse_ns_;
  bool held_{false};
  std::uint64_t number_{0};
  std::int64_t last_sign_ns_{0};
  std::string key_;
  std::string who_;
};

}  // namespace pastern::link
