// Saving and restoring everything that varies in a simulated robot.
//   "PSTB" 0x04, 3 zero bytes | 32 bytes digest of the robot | 8 bytes length of what follows | state, clock,
//   kept, push, command rows, samples | 32 bytes SHA-256 of everything before. Numbers as this machine writes
//   them: a saved state goes back into the same robot's journal folder, it is no exchange format.
#include <cstring>
#include <type_traits>

#include "hal_stub/robot/simulated_robot.h"
#include "proto/files/sha256.h"

namespace pastern::stub {
namespace {

constexpr char kMark[8] = {'P', 'S', 'T', 'B', 4, 0, 0, 0};
constexpr std::size_t kHead = 8 + 32 + 8;
constexpr std::size_t kTail = 32;

template <class T>
void put(std::string& bytes, const T& value) {
  static_assert(std::is_trivially_copyable_v<T>);
  bytes.append(reinterpret_cast<const char*>(&value), sizeof(T));
}

template <class T>
void put_all(std::string& bytes, const std::vector<T>& values, std::size_t count) {
  for (std::size_t i = 0; i < count; ++i) put(bytes, values[i]);
}

class Reader {
 public:
  explicit Reader(const char* at) : at_(at) {}
  template <class T>
  void get(T& value) {
    std::memcpy(&value, at_, sizeof(T));
    at_ += sizeof(T);
  }
  template <class T>
  void get_all(std::vector<T>& values, std::size_t count) {
    for (std::size_t i = 0; i < count; ++i) get(values[i]);
  }

 private:
  const char* at_;
};

}  // namespace

std::string SimulatedRobot::save() const {
  std::string body;
  put(body, state_);
  put(body, clock_);
  put(body, kept_);
  put(body, answered_);
  put(body, push_);
  put(body, push_begins_s_);
  put(body, figures_.pack.open_scale);
  put(body, rate_bias_);
  put(body, seed_);
  put_all(body, commands_, command_rows_);
  put_all(body, command_ticks_, command_rows_);
  put_all(body, samples_, samples_.size());
  std::string bytes(kMark, sizeof kMark);
  bytes += model_->digest();
  put(bytes, static_cast<std::uint64_t>(body.size()));
  bytes += body;
  bytes += files::raw(files::sha256(bytes));
  return bytes;
}

bool SimulatedRobot::restore(const std::string& bytes, std::string& error) {
  const std::string now = save();
  const auto refuse = [&](const char* line) {
    error = std::string("saved state of the simulated robot: ") + line;
    return false;
  };
  if (bytes.size() < kHead + kTail) return refuse("found too few bytes, expected a whole state");
  if (bytes.compare(0, 8, now, 0, 8) != 0) return refuse("found another kind or version");
  if (bytes.compare(8, 32, now, 8, 32) != 0) return refuse("found another robot's state");
  if (bytes.size() != now.size() || bytes.compare(40, 8, now, 40, 8) != 0) {
    return refuse("found another length, expected that of this robot at this site");
  }
  const std::size_t signed_bytes = bytes.size() - kTail;
  if (files::raw(files::sha256(std::string_view(bytes).substr(0, signed_bytes))) !=
      bytes.substr(signed_bytes)) {
    return refuse("found a wrong checksum");
  }
  Reader reader(bytes.data() + kHead);
  reader.get(state_);
  reader.get(clock_);
  reader.get(kept_);
  reader.get(answered_);
  reader.get(push_);
  reader.get(push_begins_s_);
  reader.get(figures_.pack.open_scale);
  reader.get(rate_bias_);
  reader.get(seed_);
  reader.get_all(commands_, command_rows_);
  reader.get_all(command_ticks_, command_rows_);
  reader.get_all(samples_, samples_.size());
  return true;
}

}  // namespace pastern::stub
