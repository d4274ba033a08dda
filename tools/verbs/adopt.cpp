// adopt: makes a policy current, shows the history, goes back.
#include <fmt/format.h>

#include <algorithm>
#include <set>

#include "proto/files/durable.h"
#include "tools/pastern/copy.h"
#include "tools/pastern/json.h"
#include "tools/pastern/link_verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

class Adopt final : public LinkVerb {
 public:
  const char* name() const override { return "adopt"; }
  const char* about() const override {
    return "Make the adapted policy current, or go back to an earlier one; --history lists them.";
  }
  const char* group() const override { return "After a session"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern adopt                       what the last verdict proposes",
        "pastern adopt --history             what was current, since when, by whom",
        "pastern adopt --back                the policy before the current one; again: the one before that",
        "pastern adopt 3fa94c01              any policy in the history, by the first digits of its sha256",
        "pastern adopt --save adopted.policy the current policy's file, for your own record"};
  }

 protected:
  void more_options(Options& options) override {
    options.text("sha256", hash_, "First digits (at least 4) of a policy in the history")
        .flag("--back", back_, "The policy before the current one; again: the one before that")
        .flag("--history", history_, "List what was current, oldest first")
        .flag("--json", json_, "With --history: as JSON")
        .text("--save", save_, "Write the current policy's file here");
  }
  Exit before() override;
  Exit run_on(RobotLine& line) override;

 private:
  Exit show_history(const std::vector<journal::Adoption>& history) const;
  Exit save_current(RobotLine& line);
  Exit adopt(RobotLine& line, const std::string& hash);
  [[nodiscard]] std::optional<std::string> chosen(const std::vector<journal::Adoption>& history) const;

  std::string hash_;
  bool back_{false};
  bool history_{false};
  bool json_{false};
  std::string save_;
};

Exit Adopt::before() {
  const int ways = (hash_.empty() ? 0 : 1) + (back_ ? 1 : 0) + (history_ ? 1 : 0) + (save_.empty() ? 0 : 1);
  if (ways > 1) {
    complain("pastern adopt: expected one of SHA256, --back, --history, --save");
    return Exit::usage;
  }
  const bool hex = hash_.find_first_not_of("0123456789abcdef") == std::string::npos;
  if (!hash_.empty() && (!hex || hash_.size() < 4 || hash_.size() > 64)) {
    complain(fmt::format("pastern adopt: found '{}', expected 4 to 64 digits of a sha256 (0-9, a-f)", hash_));
    return Exit::usage;
  }
  return Exit::done;
}

/// The policies that lead up to the current one, oldest first. A step back takes the last one off, so that
/// two steps back do not lead forward again.
std::vector<std::string> way_here(const std::vector<journal::Adoption>& history) {
  std::vector<std::string> way;
  for (const journal::Adoption& one : history) {
    const bool back = one.words == journal::kWentBack;
    while (back && !way.empty() && way.back() != one.policy_sha256_hex) way.pop_back();
    if (way.empty() || way.back() != one.policy_sha256_hex) way.push_back(one.policy_sha256_hex);
  }
  return way;
}

Exit Adopt::show_history(const std::vector<journal::Adoption>& history) const {
  if (json_) {
    std::vector<std::string> rows;
    for (const journal::Adoption& one : history) {
      rows.push_back(JsonObject()
                         .add("sha256", one.policy_sha256_hex)
                         .add("who", one.who)
                         .add("when_utc", one.when_utc)
                         .add("words", one.words)
                         .text());
    }
    say(JsonObject().raw("adoptions", json_list(rows)).text());
    return Exit::done;
  }
  if (history.empty()) {
    say("no policy was adopted yet; the robot walks the policy that it was started with");
    suggest("status", "names the policy that is current");
    return Exit::done;
  }
  Table table({"sha256", "since (UTC)", "by", "why"});
  for (const journal::Adoption& one : history) {
    table.row({brief_hash(one.policy_sha256_hex), one.when_utc, one.who, one.words});
  }
  std::string text = table.text();
  text.pop_back();
  say(text);
  const bool back = way_here(history).size() > 1;
  suggest(back ? "adopt --back" : "adopt --save adopted.policy",
          back ? "goes back to the one before the current" : "keeps a copy of the current policy");
  return Exit::done;
}

/// The policy that SHA256 or --back names; nothing after a complaint.
std::optional<std::string> Adopt::chosen(const std::vector<journal::Adoption>& history) const {
  if (back_) {
    const std::vector<std::string> way = way_here(history);
    if (way.size() > 1) return way[way.size() - 2];
    complain(
        history.empty()
            ? "pastern adopt: --back: no policy was adopted yet, so there is none to go back to"
            : "pastern adopt: --back: found the first policy current, expected a later one; pastern adopt "
              "--history lists all, pastern adopt SHA256 takes any");
    return std::nullopt;
  }
  std::set<std::string> fitting;
  for (const journal::Adoption& one : history) {
    if (one.policy_sha256_hex.compare(0, hash_.size(), hash_) == 0) fitting.insert(one.policy_sha256_hex);
  }
  if (fitting.size() == 1) return *fitting.begin();
  // A whole hash may also name a policy that walked but never was current; the robot judges it.
  if (hash_.size() == 64) return hash_;
  complain(fmt::format("pastern adopt: found {} policies in the history that begin with {}, expected one",
                       fitting.size(), hash_));
  return std::nullopt;
}

Exit Adopt::save_current(RobotLine& line) {
  v1::Status status;
  const Exit exit = line.status(status);
  if (exit != Exit::done) return exit;
  const auto bytes = fetch_policy(line, status.policy_sha256_hex(), name());
  if (!bytes) return Exit::refused;
  files::Defects defects;
  if (!files::write_durably(save_, *bytes, 0644, defects)) {
    for (const files::Defect& defect : defects) complain(defect.line());
    return Exit::file_wrong;
  }
  say(fmt::format("{}: {} bytes, sha256 {}", save_, bytes->size(), brief_hash(status.policy_sha256_hex())));
  suggest(fmt::format("check {}", save_), "judges the file; --robot names its robot file");
  return Exit::done;
}

Exit Adopt::adopt(RobotLine& line, const std::string& hash) {
  v1::Command command = command_of(&v1::Command::mutable_adopt);
  std::string bytes;
  for (std::size_t i = 0; i + 1 < hash.size(); i += 2) {
    bytes.push_back(static_cast<char>(std::stoi(hash.substr(i, 2), nullptr, 16)));
  }
  command.mutable_adopt()->set_policy_sha256(bytes);
  command.mutable_adopt()->set_back(back_);
  Exit exit = line.hold_baton();
  if (exit != Exit::done) return exit;
  v1::Answer answer;
  exit = line.ask(command, answer);
  if (exit != Exit::done) return exit;
  say(answer.words().empty() ? "adopted" : answer.words());
  suggest("adopt --save adopted.policy", "keeps a copy of it; `pastern adopt --back` undoes it");
  return Exit::done;
}

Exit Adopt::run_on(RobotLine& line) {
  if (!save_.empty()) return save_current(line);
  if (!history_ && !back_ && hash_.empty()) return adopt(line, "");
  Exit exit = Exit::done;
  const auto copy = JournalCopy::from_robot(line, name(), exit);
  if (!copy) return exit;
  const auto history = copy->journal().adoptions();
  if (history_) return show_history(history);
  const auto hash = chosen(history);
  return hash ? adopt(line, *hash) : Exit::usage;
}

}  // namespace

std::unique_ptr<Verb> make_adopt() { return std::make_unique<Adopt>(); }

}  // namespace pastern::tools
