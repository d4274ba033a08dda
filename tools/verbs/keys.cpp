// keys: makes, hands over, revokes and lists the keys of the link. Works on folders; no robot is spoken to.
#include "runtime/link/keys.h"

#include <fmt/format.h>
#include <unistd.h>

#include <algorithm>
#include <cctype>
#include <cstdlib>
#include <optional>

#include "proto/files/durable.h"
#include "proto/files/text.h"
#include "tools/pastern/json.h"
#include "tools/pastern/verb.h"
#include "tools/pastern/words.h"

namespace pastern::tools {
namespace {

std::string ground_folder() {
  const char* home = std::getenv("HOME");  // NOLINT(concurrency-mt-unsafe): one thread
  return std::string(home == nullptr ? "." : home) + "/.config/pastern/keys";
}

constexpr const char* kRobotFolder = "/etc/pastern/keys";

class Keys final : public Verb {
 public:
  const char* name() const override { return "keys"; }
  const char* about() const override {
    return "Make keys, allow and revoke who may watch or command, list them.";
  }
  const char* group() const override { return "Before the first walk"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern keys make robot --folder /etc/pastern/keys      on the robot, once",
        "pastern keys make ida                                   on Ida's laptop",
        "pastern keys trust robot.public                         on the laptop: the robot's public key",
        "pastern keys allow ida --file ida.public --may command  on the robot",
        "pastern keys allow sam --file sam.public --may watch",
        "pastern keys revoke sam",
        "pastern keys list --folder /etc/pastern/keys",
        "",
        fmt::format("Folders: make and trust use {} on the ground (make robot: {});",
                    "~/.config/pastern/keys", kRobotFolder),
        fmt::format("allow, revoke and list use {}. --folder names another. Hand over .public files only.",
                    kRobotFolder),
        "The robot reads its list again once a second; its own pair when pastern-onboard starts."};
  }
  void options(Options& options) override {
    options.choice("what", what_, {"make", "trust", "allow", "revoke", "list"}, "What to do", true)
        .text("who", who_, "Name of the key's owner (make, allow, revoke) or a file (trust)")
        .text("--folder", folder_, "Folder of keys")
        .text("--file", file_, "allow: the owner's .public file")
        .choice("--may", may_, {"watch", "command"}, "allow: what the owner may do")
        .flag("--json", json_, "list: as JSON");
  }
  Exit run() override;

 private:
  Exit make();
  Exit trust();
  Exit allow();
  Exit revoke();
  Exit list() const;
  [[nodiscard]] Exit judge_arguments();
  /// A Z85 key of 40 characters from a file; nothing after a complaint.
  [[nodiscard]] std::optional<std::string> public_key(const std::string& path) const;
  Exit wrong(const std::string& words) const {
    complain(fmt::format("pastern keys {}: {}", what_, words));
    return Exit::file_wrong;
  }

  std::string what_;
  std::string who_;
  std::string folder_;
  std::string file_;
  std::string may_;
  bool json_{false};
};

std::optional<std::string> Keys::public_key(const std::string& path) const {
  files::Defects defects;
  auto text = files::read_whole(path, defects);
  for (const files::Defect& defect : defects) complain(defect.line());
  if (!text) return std::nullopt;
  while (!text->empty() && std::isspace(static_cast<unsigned char>(text->back()))) text->pop_back();
  if (text->size() == 40) return text;
  complain(fmt::format("{}: found {} characters, expected a public key of 40 (Z85)", path, text->size()));
  return std::nullopt;
}

Exit Keys::make() {
  std::string error;
  if (!link::make_pair(folder_, who_, error)) return wrong(error);
  say(fmt::format("made {}/{}.secret (stays here, readable by you alone) and {}/{}.public", folder_, who_,
                  folder_, who_));
  if (who_ == "robot") {
    suggest("keys allow NAME --file NAME.public --may command", "lets a laptop's owner command this robot");
  } else {
    suggest("keys trust robot.public", "with the robot's public key, brought over by hand");
  }
  return Exit::done;
}

Exit Keys::trust() {
  const auto key = public_key(who_);
  if (!key) return Exit::file_wrong;
  files::Defects defects;
  if (!files::write_durably(folder_ + "/robot.public", *key + "\n", 0644, defects)) {
    return wrong(defects.empty() ? "not written" : defects.front().line());
  }
  say(fmt::format("{}/robot.public: this is the robot that your commands go to", folder_));
  suggest("status", "tries the keys");
  return Exit::done;
}

Exit Keys::allow() {
  const auto key = public_key(file_);
  if (!key) return Exit::file_wrong;
  std::string error;
  if (!link::allow(folder_, who_, may_ == "command", *key, error)) return wrong(error);
  say(fmt::format("{} may {} this robot; pastern-onboard sees it within a second or two", who_, may_));
  suggest("keys list --folder " + folder_, "who may do what");
  return Exit::done;
}

Exit Keys::revoke() {
  std::string error;
  if (!link::revoke(folder_, who_, error)) return wrong(error);
  say(fmt::format("{} is no longer allowed; pastern-onboard sees it within a second or two", who_));
  suggest("keys list --folder " + folder_, "who may do what");
  return Exit::done;
}

Exit Keys::list() const {
  link::RobotKeys keys;
  std::string error;
  if (!link::read_robot_keys(folder_, keys, error)) return wrong(error);
  if (json_) {
    std::vector<std::string> rows;
    for (const link::AllowedKey& one : keys.allowed) {
      rows.push_back(JsonObject()
                         .add("name", one.name)
                         .add("may", one.commander ? "command" : "watch")
                         .add("public", one.public_z85)
                         .text());
    }
    say(JsonObject().add("robot_public", keys.public_z85).raw("allowed", json_list(rows)).text());
    return Exit::done;
  }
  Table table({"name", "may", "public key"});
  table.row({"robot", "-", keys.public_z85});
  for (const link::AllowedKey& one : keys.allowed) {
    table.row({one.name, one.commander ? "command, watch" : "watch", one.public_z85});
  }
  std::string text = table.text();
  text.pop_back();
  say(text);
  suggest(keys.allowed.empty() ? "keys allow NAME --file NAME.public --may command" : "keys revoke NAME",
          keys.allowed.empty() ? "nobody may reach this robot yet" : "takes one off the list");
  return Exit::done;
}

Exit Keys::judge_arguments() {
  std::string missing;
  if (what_ != "list" && who_.empty()) missing = what_ == "trust" ? "the robot's .public file" : "a NAME";
  const auto add = [&missing](const char* word) {
    missing += (missing.empty() ? "" : ", ") + std::string(word);
  };
  if (what_ == "allow" && file_.empty()) add("--file NAME.public");
  if (what_ == "allow" && may_.empty()) add("--may watch or --may command");
  if (!missing.empty()) {
    complain(fmt::format("pastern keys {}: expected {}", what_, missing));
    return Exit::usage;
  }
  const bool on_ground = (what_ == "make" && who_ != "robot") || what_ == "trust";
  if (folder_.empty()) folder_ = on_ground ? ground_folder() : kRobotFolder;
  return Exit::done;
}

Exit Keys::run() {
  const Exit exit = judge_arguments();
  if (exit != Exit::done) return exit;
  if (what_ == "make") return make();
  if (what_ == "trust") return trust();
  if (what_ == "allow") return allow();
  return what_ == "revoke" ? revoke() : list();
}

}  // namespace

std::unique_ptr<Verb> make_keys() { return std::make_unique<Keys>(); }

}  // namespace pastern::tools
