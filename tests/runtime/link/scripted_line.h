// What stands behind the link in its tests: records what is passed on, answers as told, moves nothing.
#pragma once

#include <atomic>
#include <cstdint>
#include <map>
#include <mutex>
#include <string>
#include <vector>

#include "runtime/link/server.h"

namespace pastern::link::testing {

/// Commands after which a real robot could move.
inline bool moves(const v1::Command& command) {
  using What = v1::Command::WhatCase;
  switch (command.what_case()) {
    case What::kStartSession:
    case What::kGo:
    case What::kWalk:
    case What::kRelease:
    case What::kResume:
    case What::kPark:
    case What::kAdopt:
    case What::kConfirmFirstStart:
      return true;
    default:
      return false;
  }
}

class ScriptedLine : public Line {
 public:
  void stop() override {
    stops += 1;
    asked_ns = now();
  }
  void halt() override {
    halts += 1;
    asked_ns = now();
  }
  bool stop_confirmed() const override {
    return confirms && asked_ns != 0 && now() - asked_ns >= confirm_after_ns;
  }
  void baton_held(bool held) override {
    const std::lock_guard<std::mutex> lock(mutex_);
    batons_.push_back(held);
  }
  bool submit(Ticket ticket, const v1::Command& command, const Asker& asker) override {
    if (full) return false;
    submitted += 1;
    if (moves(command)) motions += 1;
    {
      const std::lock_guard<std::mutex> lock(mutex_);
      commands_.push_back(command);
      whos_.push_back(asker.who);
      keys_.push_back(asker.key);
      tickets_.push_back(ticket);
    }
    Server* to = server;
    if (answers && to != nullptr) {
      v1::Answer answer;
      answer.set_accepted(true);
      answer.set_words("done " + std::to_string(submitted.load()));
      to->answer(ticket, answer);
    }
    return true;
  }
  bool submit(Ticket ticket, const v1::Fetch& fetch) override {
    fetches += 1;
    if (full) return false;
    Server* to = server;
    if (!answers || to == nullptr) return true;
    v1::Fetched fetched;
    fetched.set_ok(true);
    const std::lock_guard<std::mutex> lock(mutex_);
    if (fetch.has_telemetry()) {
      for (auto at = kept_.lower_bound(fetch.telemetry().from_sequence());
           at != kept_.end() && at->first <= fetch.telemetry().to_sequence() &&
           fetched.telemetry_size() < piece;
           ++at) {
        *fetched.add_telemetry() = at->second;
      }
    }
    to->answer(ticket, fetched);
    return true;
  }
  v1::Status status() const override {
    v1::Status status;
    status.set_robot("scripted");
    status.set_robot_state(v1::READY);
    status.set_last_sequence(last_sequence);
    return status;
  }

  /// Publishes a note, and keeps it for fetches unless told not to.
  void tell(std::uint64_t sequence, const std::string& note, bool keep = true) {
    v1::Telemetry telemetry;
    telemetry.set_sequence(sequence);
    telemetry.set_note(note);
    last_sequence = sequence;
    if (keep) {
      const std::lock_guard<std::mutex> lock(mutex_);
      kept_[sequence] = telemetry;
    }
    server.load()->publish(telemetry);
  }

  [[nodiscard]] std::vector<bool> batons() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return batons_;
  }
  [[nodiscard]] std::vector<std::string> whos() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return whos_;
  }
  [[nodiscard]] std::vector<std::string> keys() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return keys_;
  }
  [[nodiscard]] std::vector<Ticket> tickets() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return tickets_;
  }
  [[nodiscard]] std::vector<v1::Command> commands() const {
    const std::lock_guard<std::mutex> lock(mutex_);
    return commands_;
  }

  std::atomic<Server*> server{nullptr};
  std::atomic<bool> answers{true};
  std::atomic<bool> full{false};
  std::atomic<bool> confirms{true};
  std::atomic<std::int64_t> confirm_after_ns{1'000'000};
  std::atomic<int> piece{1000};  ///< most telemetry in one fetched piece
  std::atomic<std::uint64_t> last_sequence{0};
  std::atomic<int> stops{0};
  std::atomic<int> halts{0};
  std::atomic<int> submitted{0};
  std::atomic<int> motions{0};
  std::atomic<int> fetches{0};

 private:
  [[nodiscard]] static std::int64_t now() {
    timespec time{};
    clock_gettime(CLOCK_MONOTONIC, &time);
    return std::int64_t{time.tv_sec} * 1'000'000'000 + time.tv_nsec;
  }

  std::atomic<std::int64_t> asked_ns{0};
  mutable std::mutex mutex_;
  std::vector<bool> batons_;
  std::vector<v1::Command> commands_;
  std::vector<std::string> whos_;
  std::vector<std::string> keys_;
  std::vector<Ticket> tickets_;
  std::map<std::uint64_t, v1::Telemetry> kept_;
};

}  // namespace pastern::link::testing
