// report: a session as one self-contained HTML page, or as text.
#include <fmt/format.h>

#include <filesystem>

#include "proto/files/durable.h"
#include "proto/files/robot_file.h"
#include "tools/pastern/copy.h"
#include "tools/pastern/follow.h"
#include "tools/pastern/json.h"
#include "tools/pastern/words.h"
#include "tools/report/sections.h"

namespace pastern::tools {
namespace {

class Report final : public Verb {
 public:
  const char* name() const override { return "report"; }
  const char* about() const override { return "The session as one HTML page to hand in, or as text."; }
  const char* group() const override { return "After a session"; }
  std::vector<std::string> examples() const override {
    return {
        "pastern report                                  fetched from the robot, to pastern-session-N.html",
        "pastern report --out monday.html --session 2", "pastern report --text",
        "pastern report --journal /var/lib/pastern       from a journal folder or file, without a robot",
        "pastern report --robot-file my.robot.txtpb      draws the lane's edges too"};
  }
  void options(Options& options) override {
    options
        .text("--journal", journal_,
              "Journal folder or file; without it the journal is fetched from the robot")
        .text("--out", out_, "File to write")
        .text("--robot-file", robot_, "Robot file, for the lane")
        .whole("--session", session_, "Number of the session; 0: the last one", 0, 1000000000)
        .flag("--text", text_, "Print the same facts as text")
        .flag("--json", json_, "Print verdict and walks as JSON");
    reach_.options(options);
  }
  Exit run() override;

 private:
  [[nodiscard]] std::optional<JournalCopy> open(Exit& exit) const;
  Exit write(const Facts& facts) const;
  void print_json(const Facts& facts) const;

  Reach reach_;
  std::string journal_;
  std::string out_;
  std::string robot_;
  std::uint64_t session_{0};
  bool text_{false};
  bool json_{false};
};

std::optional<JournalCopy> Report::open(Exit& exit) const {
  if (!journal_.empty()) {
    auto copy = JournalCopy::from_folder(journal_, name());
    exit = copy ? Exit::done : Exit::file_wrong;
    return copy;
  }
  const auto line = RobotLine::open(reach_, name(), exit);
  return line ? JournalCopy::from_robot(*line, name(), exit) : std::nullopt;
}

void Report::print_json(const Facts& facts) const {
  std::vector<std::string> walks;
  for (v1::Episode walk : facts.walks) {
    walk.clear_trace();
    walks.push_back(json(walk));
  }
  const bool tiny = facts.verdict && facts.verdict->pairs() > 0 &&
                    of_no_practical_size(facts.verdict->effect(), facts.verdict->effect_low(),
                                         facts.verdict->effect_high());
  say(JsonObject()
          .add("session", facts.row.session)
          .add("ended", facts.row.ended)
          .add("software", facts.row.software)
          .add("begun", facts.begun)
          .add("simulated", facts.simulated)
          .add("drives", facts.drives)
          .add("drives_settings", facts.drives_settings)
          .add("site", facts.simulated ? site_of(facts.drives_settings) : "")
          .add("practical_size", kPracticalSize)
          .add("of_no_practical_size", tiny)
          .add("robot_sha256", facts.row.robot_sha256_hex)
          .add("start_policy_sha256", facts.row.start_policy_sha256_hex)
          .add("digest", facts.digest)
          .raw("verdict", facts.verdict ? json(*facts.verdict) : "null")
          .raw("walks", json_list(walks))
          .text());
}

Exit Report::write(const Facts& facts) const {
  const std::string path = out_.empty() ? fmt::format("pastern-session-{}.html", facts.row.session) : out_;
  const std::string page = to_html(report_of(facts));
  files::Defects defects;
  if (!files::write_durably(path, page, 0644, defects)) {
    for (const files::Defect& defect : defects) complain(defect.line());
    return Exit::file_wrong;
  }
  std::error_code error;
  const std::string whole = std::filesystem::absolute(path, error).string();
  say(fmt::format("report: {}", error ? path : whole));
  const bool adopt = facts.verdict && facts.verdict->kind() == v1::Verdict::ADOPT;
  suggest(adopt ? "adopt" : "status", adopt ? "makes the adapted policy current" : "what the robot does now");
  return Exit::done;
}

Exit Report::run() {
  std::optional<v1::Robot> robot;
  if (!robot_.empty()) {
    files::Defects defects;
    const auto file = files::read_robot(robot_, defects);
    for (const files::Defect& defect : defects) complain(defect.line());
    if (!file) return Exit::file_wrong;
    robot = file->robot();
  }
  Exit exit = Exit::done;
  const auto copy = open(exit);
  if (!copy) return exit;
  std::string why;
  auto facts = gather(copy->journal(), session_, why);
  if (!facts) {
    complain(fmt::format("pastern report: {}: {}", copy->source(), why));
    return Exit::file_wrong;
  }
  facts->source = copy->source();
  facts->robot = robot;
  if (json_) {
    print_json(*facts);
  } else if (text_) {
    std::string text = to_text(report_of(*facts));
    text.pop_back();
    say(text);
    suggest("report --out report.html", "the same as a page, with pictures");
  } else {
    return write(*facts);
  }
  return Exit::done;
}

}  // namespace

std::unique_ptr<Verb> make_report() { return std::make_unique<Report>(); }

}  // namespace pastern::tools
