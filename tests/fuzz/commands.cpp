// Any messages from anybody: what is not allowed reaches neither the session nor the cycle, and every answer
// can be sent.
#include "runtime/link/desk.h"
#include "runtime/link/wire.h"
#include "tests/fuzz/input.h"
#include "tests/runtime/link/scripted_line.h"

namespace pastern::fuzz {
namespace {

using namespace link;

constexpr std::int64_t kMs = 1'000'000;

const Sender& sender(std::uint8_t who) {
  static const Sender kSenders[] = {{"key-of-anna", "anna", Role::commander},
                                    {"key-of-ben", "ben", Role::commander},
                                    {"key-of-screen", "screen", Role::observer},
                                    {"key-of-gone", "", std::nullopt}};
  return kSenders[who % 4];
}

/// A command that is well formed, with the baton that is held now or another.
std::string composed(Input& in, const Desk& desk) {
  v1::Command command;
  command.set_format(in.byte() % 16 == 0 ? 2 : 1);
  command.set_id(std::to_string(in.byte() % 32));
  const std::uint8_t baton = in.byte();
  command.set_baton(baton % 2 == 0 ? desk.baton().number() : baton);
  switch (in.byte() % 9) {
    case 0:
      command.mutable_take_baton();
      break;
    case 1:
      command.mutable_sign_of_life();
      break;
    case 2:
      command.mutable_give_baton();
      break;
    case 3:
      command.mutable_walk()->set_duration_s(in.number(5));
      break;
    case 4:
      command.mutable_stop();
      break;
    case 5:
      command.mutable_halt();
      break;
    case 6:
      command.mutable_release();
      break;
    case 7:
      command.mutable_start_session()->set_plan_text(in.bytes(200));
      break;
    default:
      command.mutable_ask_status();
      break;
  }
  return command.SerializeAsString();
}

}  // namespace
}  // namespace pastern::fuzz

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace pastern;
  using namespace pastern::link;
  wire::silence_protobuf();
  fuzz::Input in(data, size);
  testing::ScriptedLine line;
  line.answers = false;
  line.confirms = false;
  Desk desk(line, 500 * fuzz::kMs, 1'000'000'007);
  std::int64_t now_ns = 1'000 * fuzz::kMs;
  std::size_t asked = 0;
  std::size_t answered = 0;
  while (!in.empty()) {
    const Sender from = fuzz::sender(in.byte());
    const bool garbage = in.byte() % 4 == 0;
    const std::string bytes = garbage ? in.bytes(600) : fuzz::composed(in, desk);
    const bool holds = desk.baton().held() && desk.baton().key() == from.key;
    const bool commands = from.role == Role::commander;
    const int motions = line.motions;
    const int stops = line.stops + line.halts;
    std::vector<Mail> mails{Mail{Route{"route", false}, from, bytes, in.byte() % 16 != 0}};
    desk.serve(mails, now_ns);
    fuzz::expect(line.motions == motions || (commands && holds), "only the baton's holder moves the robot");
    fuzz::expect(line.stops + line.halts == stops || commands, "only who commands stops it");
    ++asked;
    answered += desk.replies().size();
    fuzz::expect(answered <= asked, "one answer to a message at the most");
    for (const Reply& reply : desk.replies()) {
      fuzz::expect(reply.answer.IsInitialized() && reply.answer.ByteSizeLong() < (1U << 20U),
                   "an answer that can be sent");
    }
    desk.replies().clear();
    now_ns += in.byte() * 4 * fuzz::kMs;
    desk.judge(now_ns);
    fuzz::expect(!desk.baton().held() || now_ns <= desk.baton().deadline_ns(), "a baton lapses");
  }
  return 0;
}
