// What is done with a command.
#include "runtime/link/desk.h"

#include <algorithm>
#include <functional>
#include <limits>
#include <string_view>

#include "runtime/link/wire.h"

namespace pastern::link {
namespace {

constexpr std::uint32_t kFormat = 1;
constexpr std::size_t kMostTickets = 256;
constexpr std::size_t kMostStops = 256;
// A stop with the longest id and name is far below; a candidate policy is far above. What is larger is not
// looked through for stops, so that a flood of large messages cannot delay one.
constexpr std::size_t kLargestUrgent = 2048;

using What = v1::Command::WhatCase;

bool is_stop(What what) { return what == What::kStop || what == What::kHalt; }
bool is_light(What what) { return what == What::kSignOfLife || what == What::kAskStatus; }
bool needs_baton(What what) { return !is_stop(what) && what != What::kTakeBaton && what != What::kAskStatus; }

bool printable(const std::string& text) {
  return std::none_of(text.begin(), text.end(),
                      [](char c) { return static_cast<unsigned char>(c) < 0x20 || c == 0x7f; });
}

// Empty when the id and the name can be used.
std::string misshapen(const v1::Command& command) {
  if (command.format() != kFormat) {
    return "found format " + std::to_string(command.format()) + ", expected " + std::to_string(kFormat);
  }
  if (command.id().empty() || command.id().size() > Desk::kLongestName || !printable(command.id())) {
    return "found an id of " + std::to_string(command.id().size()) + " bytes, expected 1 to " +
           std::to_string(Desk::kLongestName) + " printable ones";
  }
  if (command.operator_name().size() > Desk::kLongestName || !printable(command.operator_name())) {
    return "found an operator's name of " + std::to_string(command.operator_name().size()) +
           " bytes, expected at most " + std::to_string(Desk::kLongestName) + " printable ones";
  }
  if (command.what_case() == What::WHAT_NOT_SET) return "found no command that is known here";
  return {};
}

// For people: the key's name is proven, the operator's is only said.
std::string who(const Sender& sender, const v1::Command& command) {
  std::string said = command.operator_name().empty() ? "somebody" : command.operator_name();
  if (sender.name.empty()) return said;
  if (command.operator_name().empty() || command.operator_name() == sender.name) return sender.name;
  return said + " (key " + sender.name + ")";
}

std::size_t digest(const std::string& bytes) { return std::hash<std::string_view>{}(bytes); }

v1::Answer made(bool accepted, const std::string& words) {
  v1::Answer answer;
  answer.set_accepted(accepted);
  answer.set_words(words);
  return answer;
}

}  // namespace

Desk::Desk(Line& line, std::int64_t baton_lapse_ns, std::uint64_t first_baton)
    : line_(line), baton_(first_baton, baton_lapse_ns) {
  wire::silence_protobuf();
}

void Desk::serve(std::vector<Mail>& mails, std::int64_t now_ns) {
  std::vector<Opened> opened(mails.size());
  for (std::size_t i = 0; i < mails.size(); ++i) {
    opened[i].mail = &mails[i];
    if (!mails[i].framed || mails[i].bytes.size() > kLargestUrgent) continue;
    v1::Command& command = opened[i].command;
    opened[i].readable = command.ParseFromString(mails[i].bytes);
    if (!opened[i].readable) continue;
    if (!is_stop(command.what_case()) && command.what_case() != What::kSignOfLife) continue;
    serve_one(opened[i], now_ns);
    opened[i].served = true;
  }
  judge_baton(now_ns);
  for (Opened& each : opened) {
    if (each.served) continue;
    if (each.mail->framed && !each.readable) each.readable = each.command.ParseFromString(each.mail->bytes);
    serve_one(each, now_ns);
  }
}

void Desk::serve_one(const Opened& opened, std::int64_t now_ns) {
  const Mail& mail = *opened.mail;
  const v1::Command& command = opened.command;
  if (!mail.framed) return refuse(opened, "refused: found a message of several frames, expected one Command");
  if (!opened.readable) {
    return refuse(opened, "refused: found " + std::to_string(mail.bytes.size()) +
                              " bytes that are no Command of pastern/v1/link.proto");
  }
  if (!mail.sender.role) return refuse(opened, "refused: this key is not on the robot's list");
  if (const std::string wrong = misshapen(command); !wrong.empty())
    return refuse(opened, "refused: " + wrong);
  if (*mail.sender.role != Role::commander && command.what_case() != What::kAskStatus) {
    return refuse(opened, "refused: key " + mail.sender.name +
                              " observes (status, telemetry, fetch); commands need an operator's key");
  }
  if (repeated(opened, now_ns)) return;
  act(opened, now_ns);
}

bool Desk::repeated(const Opened& opened, std::int64_t now_ns) {
  const v1::Command& command = opened.command;
  Asked* asked = recall({opened.mail->sender.key, command.id()});
  if (asked == nullptr) return false;
  if (asked->digest != digest(opened.mail->bytes)) {
    // Whoever wants to stop is not turned away over an id.
    if (is_stop(command.what_case())) {
      stop(opened, false, now_ns);
    } else {
      refuse(opened, "refused: the id was used for another command; a new command needs a new id");
    }
    return true;
  }
  if (!asked->answered) {
    wait_at(*asked, opened.mail->route);
    return true;
  }
  v1::Answer again = asked->answer;
  again.set_repeated(true);
  reply(opened, again);
  return true;
}

void Desk::act(const Opened& opened, std::int64_t now_ns) {
  const v1::Command& command = opened.command;
  const What what = command.what_case();
  if (is_stop(what)) return stop(opened, true, now_ns);
  if (what == What::kAskStatus) {
    v1::Answer answer = made(true, "status");
    *answer.mutable_status() = line_.status();
    answer.mutable_status()->set_baton_holder(baton_.holder());
    return conclude(opened, answer);
  }
  if (what == What::kTakeBaton) return take_baton(opened, now_ns);
  if (needs_baton(what) && !baton_.held_by(command.baton(), opened.mail->sender.key)) {
    return conclude(opened, made(false, "refused: " + baton_.why_not(command.baton())));
  }
  if (what == What::kSignOfLife) return sign_of_life(opened, now_ns);
  if (what == What::kGiveBaton) return give_baton(opened);
  submit(opened);
}

void Desk::take_baton(const Opened& opened, std::int64_t now_ns) {
  const Sender& sender = opened.mail->sender;
  const std::uint64_t number = baton_.take(sender.key, who(sender, opened.command), now_ns);
  if (number == 0) {
    return conclude(opened, made(false, "refused: " + baton_.holder() + " holds the baton"));
  }
  line_.baton_held(true);
  v1::Answer answer = made(true, baton_.holder() + " holds the baton");
  answer.set_baton(number);
  conclude(opened, answer);
}

void Desk::sign_of_life(const Opened& opened, std::int64_t now_ns) {
  if (!baton_.renew(opened.command.baton(), opened.mail->sender.key, now_ns)) return;
  conclude(opened, made(true, "baton renewed"));
}

void Desk::give_baton(const Opened& opened) {
  baton_.drop();
  line_.baton_held(false);
  conclude(opened, made(true, "baton given back"));
}

void Desk::submit(const Opened& opened) {
  if (tickets_.size() >= kMostTickets) {
    std::erase_if(tickets_, [this](const auto& ticket) { return recall(ticket.second) == nullptr; });
  }
  const Ticket ticket = next_ticket();
  const Sender& sender = opened.mail->sender;
  // A full queue is no decision about the command: the same id may come again.
  const Asker asker{who(sender, opened.command), sender.key};
  if (tickets_.size() >= kMostTickets || !line_.submit(ticket, opened.command, asker)) {
    return refuse(opened, "refused: too many commands are waiting; try again");
  }
  Asked& asked = remember(opened);
  asked.ticket = ticket.number;
  wait_at(asked, opened.mail->route);
  tickets_[ticket.number] = Origin{sender.key, opened.command.id()};
}

void Desk::answered(Ticket ticket, const v1::Answer& answer) {
  const auto found = tickets_.find(ticket.number);
  if (found == tickets_.end()) return;
  const Origin origin = found->second;
  tickets_.erase(found);
  Asked* asked = recall(origin);
  if (asked == nullptr || asked->ticket != ticket.number || asked->answered) return;
  conclude(*asked, origin.id, answer);
}

void Desk::stop(const Opened& opened, bool remembered, std::int64_t now_ns) {
  const bool halt = opened.command.what_case() == What::kHalt;
  if (halt) {
    line_.halt();
  } else {
    line_.stop();
  }
  Stop pending{{}, opened.mail->route, opened.command.id(), halt, now_ns};
  if (remembered) {
    wait_at(remember(opened), opened.mail->route);
    pending.origin = Origin{opened.mail->sender.key, opened.command.id()};
  }
  stops_.push_back(pending);
  if (stops_.size() <= kMostStops) return;
  settle(stops_.front(), line_.stop_confirmed(), now_ns);
  stops_.erase(stops_.begin());
}

void Desk::settle_stops(std::int64_t now_ns) {
  if (stops_.empty()) return;
  const bool confirmed = line_.stop_confirmed();
  std::vector<Stop> waiting;
  for (const Stop& stop : stops_) {
    if (confirmed || now_ns - stop.since_ns >= kConfirmWithinNs) {
      settle(stop, confirmed, now_ns);
    } else {
      waiting.push_back(stop);
    }
  }
  stops_.swap(waiting);
}

void Desk::settle(const Stop& stop, bool confirmed, std::int64_t now_ns) {
  const std::string name = stop.halt ? "halt" : "stop";
  const std::int64_t tenths = (now_ns - stop.since_ns) / 100'000;
  const std::string after = std::to_string(tenths / 10) + "." + std::to_string(tenths % 10) + " ms";
  v1::Answer answer = made(true, confirmed ? name + " confirmed: the robot has written a " +
                                                 (stop.halt ? "torque-free" : "damped or torque-free") +
                                                 " command, " + after + " after it was asked"
                                           : name + " is set, but the robot has NOT confirmed it within " +
                                                 after + ": use the emergency stop");
  answer.set_confirmed(confirmed);
  answer.set_id(stop.id);
  Asked* asked = stop.origin.id.empty() ? nullptr : recall(stop.origin);
  if (asked != nullptr) {
    conclude(*asked, stop.id, answer);
  } else {
    replies_.push_back(Reply{stop.route, answer});
  }
}

void Desk::judge(std::int64_t now_ns) {
  settle_stops(now_ns);
  judge_baton(now_ns);
}

void Desk::judge_baton(std::int64_t now_ns) {
  if (baton_.lapsed(now_ns)) line_.baton_held(false);
}

std::int64_t Desk::wake_ns() const {
  std::int64_t wake = std::numeric_limits<std::int64_t>::max();
  if (baton_.held()) wake = baton_.deadline_ns() + 1;
  for (const Stop& stop : stops_) wake = std::min(wake, stop.since_ns + kConfirmWithinNs);
  return wake;
}

Asked* Desk::recall(const Origin& origin) {
  Memory& memory = memories_[origin.key];
  Asked* asked = memory.commands.find(origin.id);
  return asked != nullptr ? asked : memory.light.find(origin.id);
}

Asked& Desk::remember(const Opened& opened) {
  Memory& memory = memories_[opened.mail->sender.key];
  Recent& recent = is_light(opened.command.what_case()) ? memory.light : memory.commands;
  return recent.remember(opened.command.id(), digest(opened.mail->bytes));
}

void Desk::reply(const Opened& opened, const v1::Answer& answer) {
  replies_.push_back(Reply{opened.mail->route, answer});
}

// Nothing was decided about the id: not remembered.
void Desk::refuse(const Opened& opened, const std::string& words) {
  v1::Answer answer = made(false, words);
  if (opened.command.id().size() <= kLongestName) answer.set_id(opened.command.id());
  reply(opened, answer);
}

void Desk::conclude(const Opened& opened, v1::Answer answer) {
  Asked& asked = remember(opened);
  wait_at(asked, opened.mail->route);
  conclude(asked, opened.command.id(), std::move(answer));
}

void Desk::conclude(Asked& asked, const std::string& id, v1::Answer answer) {
  answer.set_id(id);
  asked.answer = std::move(answer);
  asked.answered = true;
  for (const Route& route : asked.waiting) replies_.push_back(Reply{route, asked.answer});
  asked.waiting.clear();
}

}  // namespace pastern::link
