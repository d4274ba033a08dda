// What is done with a command: who may, in which order, what is answered. No sockets and no clock in here:
// the server hands in messages and the time (CLOCK_MONOTONIC, ns), and takes replies out. Link thread only.
//
// Who may what:
//   not on the list  nothing (CURVE lets it not even connect; a revoked key is refused here)
//   observer         ask_status (and fetch and telemetry, see server.h). Not stop either: an observer's key
//   is
//                    handed out freely, and a controlled stop is a movement. Who sees danger has the robot's
//                    emergency stop, which no key guards.
//   commander        all; the baton is needed for all but stop, halt, take_baton, ask_status
#pragma once

#include <cstdint>
#include <map>
#include <optional>
#include <string>
#include <unordered_map>
#include <vector>

#include "pastern/v1/link.pb.h"
#include "runtime/link/baton.h"
#include "runtime/link/recent.h"
#include "runtime/link/server.h"

namespace pastern::link {

struct Sender {
  std::string key;           ///< public key, Z85; empty without keys
  std::string name;          ///< its name on the list; empty without keys
  std::optional<Role> role;  ///< nothing: not on the list
};

/// One message on the command socket.
struct Mail {
  Route route;
  Sender sender;
  std::string bytes;
  bool framed{true};  ///< one message frame, after an empty one or not
};

struct Reply {
  Route route;
  v1::Answer answer;
};

class Desk {
 public:
  static constexpr std::int64_t kConfirmWithinNs = 300'000'000;
  static constexpr std::size_t kLongestName = 64;

  Desk(Line& line, std::int64_t baton_lapse_ns, std::uint64_t first_baton);

  /// Stops first: all that arrived is looked through for stop, halt and signs of life; then the baton is
  /// judged (a sign of life that had arrived counts, however late this thread got to it); then the rest in
  /// order.
  void serve(std::vector<Mail>& mails, std::int64_t now_ns);
  /// Stops waiting for confirmation, baton lapse. To be called at least when wake_ns() says.
  void judge(std::int64_t now_ns);
  /// The session thread's answer to a submitted command.
  void answered(Ticket ticket, const v1::Answer& answer);

  [[nodiscard]] bool stop_pending() const { return !stops_.empty(); }
  /// When judge() has something to do without a message; far away when nothing is due.
  [[nodiscard]] std::int64_t wake_ns() const;
  [[nodiscard]] const Baton& baton() const { return baton_; }
  /// A number for a ticket, also for fetches: one series for both.
  [[nodiscard]] Ticket next_ticket() { return Ticket{++last_ticket_}; }
  /// Replies that are ready; the caller sends and clears them.
  [[nodiscard]] std::vector<Reply>& replies() { return replies_; }

 private:
  struct Origin {
    std::string key;
    std::string id;
  };
  struct Memory {
    Recent commands{4096};
    Recent light{1024};  ///< signs of life and status, so that they cannot push out the rest
  };
  struct Stop {
    Origin origin;  ///< of the remembered command; empty id when it is not remembered
    Route route;    ///< used when it is not remembered
    std::string id;
    bool halt{false};
    std::int64_t since_ns{0};
  };
  struct Opened {
    const Mail* mail{nullptr};
    v1::Command command;
    bool readable{false};
    bool served{false};
  };

  void serve_one(const Opened& opened, std::int64_t now_ns);
  [[nodiscard]] bool repeated(const Opened& opened, std::int64_t now_ns);
  void act(const Opened& opened, std::int64_t now_ns);
  void take_baton(const Opened& opened, std::int64_t now_ns);
  void sign_of_life(const Opened& opened, std::int64_t now_ns);
  void give_baton(const Opened& opened);
  void submit(const Opened& opened);
  void stop(const Opened& opened, bool remembered, std::int64_t now_ns);
  void settle_stops(std::int64_t now_ns);
  void settle(const Stop& stop, bool confirmed, std::int64_t now_ns);
  void judge_baton(std::int64_t now_ns);

  Asked& remember(const Opened& opened);
  [[nodiscard]] Asked* recall(const Origin& origin);
  void reply(const Opened& opened, const v1::Answer& answer);
  void refuse(const Opened& opened, const std::string& words);
  void conclude(const Opened& opened, v1::Answer answer);
  void conclude(Asked& asked, const std::string& id, v1::Answer answer);

  Line& line_;
  Baton baton_;
  std::map<std::string, Memory> memories_;  ///< by public key: nobody pushes out another's
  std::unordered_map<std::uint64_t, Origin> tickets_;
  std::vector<Stop> stops_;
  std::vector<Reply> replies_;
  std::uint64_t last_ticket_{0};
};

}  // namespace pastern::link
