// void: marks a walk as one that does not count.
#include "tools/pastern/link_verb.h"

namespace pastern::tools {
namespace {

class MarkVoid final : public LinkVerb {
 public:
  const char* name() const override { return "void"; }
  const char* about() const override { return "Mark a walk as void: it does not count and is run again."; }
  const char* group() const override { return "In a session"; }
  std::vector<std::string> examples() const override {
    return {"pastern void --reason \"somebody bumped it\"",
            "pastern void --walk 12 --reason \"cable under the foot\"", "",
            "Without --walk: the walk that was finished last."};
  }

 protected:
  void more_options(Options& options) override {
    options.whole("--walk", walk_, "Number of the walk; 0: the last one", 0, 1000000)
        .text("--reason", reason_, "Why, for the record");
  }
  Exit run_on(RobotLine& line) override {
    v1::Command command = command_of(&v1::Command::mutable_mark_void);
    if (walk_ == 0) {
      v1::Status status;
      const Exit exit = line.status(status);
      if (exit != Exit::done) return exit;
      walk_ = status.walks_done();
    }
    command.mutable_mark_void()->set_walk(walk_);
    command.mutable_mark_void()->set_reason(reason_);
    return command_and_suggest(line, command, "marked void");
  }

 private:
  std::uint64_t walk_{0};
  std::string reason_{"marked by the operator"};
};

}  // namespace

std::unique_ptr<Verb> make_void() { return std::make_unique<MarkVoid>(); }

}  // namespace pastern::tools
