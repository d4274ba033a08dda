// Signs of life for a baton.
#include "runtime/link/renewal.h"

#include <array>
#include <chrono>
#include <cinttypes>
#include <cstdio>

#include "pastern/v1/link.pb.h"

namespace pastern::link {
namespace {

constexpr std::chrono::milliseconds kEvery{100};
constexpr int kSilentTurns = 5;  // then a new connection is tried

}  // namespace

std::string fresh_id() {
  std::array<char, 33> text{};
  (void)std::snprintf(text.data(), text.size(), "%016" PRIx64 "%016" PRIx64, wire::random_u64(),
                      wire::random_u64());
  return text.data();
}

Renewal::Renewal(Dial& dial, int port, std::string operator_name, std::uint64_t number)
    : dial_(dial), port_(port), operator_name_(std::move(operator_name)), number_(number), thread_([this] {
        run();
      }) {}

Renewal::~Renewal() {
  {
    const std::lock_guard<std::mutex> lock(mutex_);
    ending_ = true;
  }
  wake_.notify_all();
  thread_.join();
}

std::string Renewal::sign() const {
  v1::Command command;
  command.set_format(1);
  command.set_id(fresh_id());
  command.set_operator_name(operator_name_);
  command.set_baton(number_.load());
  (void)command.mutable_sign_of_life();
  return command.SerializeAsString();
}

void Renewal::run() {
  wire::block_signals();
  Caller caller(dial_, port_);
  int silent = 0;
  std::unique_lock<std::mutex> lock(mutex_);
  auto due = std::chrono::steady_clock::now();
  while (!ending_) {
    lock.unlock();
    silent += 1;
    while (const std::optional<std::string> came = caller.heard()) {
      v1::Answer answer;
      if (!answer.ParseFromString(*came)) continue;
      silent = 0;
      if (!answer.accepted()) number_.store(0);
    }
    if (number_.load() == 0) return;
    if (silent > kSilentTurns) {
      caller.hang_up();
      silent = 0;
    }
    (void)caller.tell(sign());
    lock.lock();
    // After a long pause (a laptop that slept) there is nothing to catch up on.
    due = std::max(due + kEvery, std::chrono::steady_clock::now());
    wake_.wait_until(lock, due, [this] { return ending_; });
  }
}

}  // namespace pastern::link
