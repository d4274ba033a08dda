// What was missed, or is wanted later: telemetry by sequence, a copy of the journal in pieces, a policy.
#include <algorithm>

#include "runtime/onboard/program.h"

namespace pastern::onboard {
namespace {

constexpr std::uint64_t kMostTelemetry = 500;
constexpr std::size_t kMostBytes = 1 << 20;

v1::Fetched failed(const std::string& words) {
  v1::Fetched fetched;
  fetched.set_words("refused: " + words);
  return fetched;
}

}  // namespace

void Program::answer(const Asked& asked, const v1::Fetch& fetch) {
  switch (fetch.what_case()) {
    case v1::Fetch::kTelemetry:
      return server_->answer(asked.ticket, fetched(fetch.telemetry()));
    case v1::Fetch::kJournal:
      return server_->answer(asked.ticket, fetched(fetch.journal()));
    case v1::Fetch::kPolicy:
      return server_->answer(asked.ticket, fetched(fetch.policy()));
    default:
      return server_->answer(asked.ticket, failed("expected telemetry, journal or policy"));
  }
}

v1::Fetched Program::fetched(const v1::FetchTelemetry& fetch) const {
  if (fetch.from_sequence() > fetch.to_sequence()) {
    return failed("from_sequence: found " + std::to_string(fetch.from_sequence()) + ", expected at most " +
                  std::to_string(fetch.to_sequence()));
  }
  v1::Fetched answer;
  std::size_t bytes = 0;
  // Sequence numbers have gaps where a status was; the journal gives those it keeps, oldest first.
  for (const v1::Telemetry& telemetry :
       parts_.journal.telemetry(fetch.from_sequence(), fetch.to_sequence())) {
    bytes += telemetry.ByteSizeLong();
    const bool full = static_cast<std::uint64_t>(answer.telemetry_size()) >= kMostTelemetry;
    if (full || (bytes > kMostBytes && answer.telemetry_size() > 0)) {
      answer.set_words("more follows; ask again after the last sequence");
      break;
    }
    *answer.add_telemetry() = telemetry;
  }
  answer.set_ok(true);
  return answer;
}

v1::Fetched Program::fetched(const v1::FetchJournal& fetch) {
  if (fetch.offset() == 0) snapshot_ = parts_.journal.snapshot();
  if (snapshot_.empty()) return failed("no copy of the journal could be made; begin again at offset 0");
  if (fetch.offset() >= snapshot_.size()) {
    return failed("offset: found " + std::to_string(fetch.offset()) + ", expected less than " +
                  std::to_string(snapshot_.size()));
  }
  v1::Fetched answer;
  answer.set_ok(true);
  answer.set_bytes(snapshot_.substr(fetch.offset(), kMostBytes));
  answer.set_total_bytes(snapshot_.size());
  if (fetch.offset() + kMostBytes >= snapshot_.size()) snapshot_.clear();
  return answer;
}

v1::Fetched Program::fetched(const v1::FetchPolicy& fetch) const {
  const std::string sha = files::hex(fetch.sha256());
  const std::optional<std::string> bytes = parts_.journal.policy(sha);
  if (!bytes) return failed("no policy with sha256 " + sha + " in the journal");
  v1::Fetched answer;
  answer.set_ok(true);
  answer.set_bytes(*bytes);
  answer.set_total_bytes(bytes->size());
  return answer;
}

}  // namespace pastern::onboard
