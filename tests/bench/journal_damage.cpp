// Promise: a journal cut short at any byte, or with a bit flipped, is refused or gives back exactly what was
// written.
#include <stdlib.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <filesystem>
#include <fstream>
#include <random>
#include <string>

#include "runtime/journal/journal.h"
#include "tests/bench/promise.h"
#include "tests/faults/twelve_walks.h"

namespace {

using pastern::faults::Acknowledged;
using pastern::journal::Journal;

enum class Outcome { refused, unchanged, changed };

void write(const std::string& file, const std::string& bytes) {
  std::ofstream(file, std::ios::binary | std::ios::trunc) << bytes;
}

/// What a reader makes of the file.
Outcome judge(const std::string& file, const Acknowledged& written, const std::string& digest) {
  std::string error;
  const auto journal = Journal::open(file, error, "", true);
  if (!journal) return Outcome::refused;
  const bool whole =
      pastern::faults::missing(*journal, written).empty() && journal->digest(written.session) == digest;
  if (!journal->failure().empty()) return Outcome::refused;
  return whole ? Outcome::unchanged : Outcome::changed;
}

}  // namespace

int main(int argc, char** argv) {
  CLI::App app("A damaged journal: cut short at every byte, and with random bits flipped.");
  std::uint64_t seed = 1;
  std::uint64_t flips = 1000;
  bool quick = false;
  app.add_option("--seed", seed, "of the flipped bits");
  app.add_option("--flips", flips, "how many");
  app.add_flag("--quick", quick, "every 997th byte, 100 flips");
  CLI11_PARSE(app, argc, argv);
  if (quick) flips = 100;

  std::string folder = (std::filesystem::temp_directory_path() / "pastern_damage_XXXXXX").string();
  if (mkdtemp(folder.data()) == nullptr) return 70;
  std::string error;
  std::string bytes;
  std::string digest;
  Acknowledged written;
  {
    const auto journal = Journal::open(folder, error);
    if (!journal || !pastern::faults::continue_session(*journal, written)) return 70;
    digest = journal->digest(written.session);
    bytes = journal->snapshot();
  }
  const std::string file = folder + "/damaged.journal";
  std::uint64_t counts[3] = {0, 0, 0};
  write(file, bytes);
  const std::size_t stride = quick ? 997 : 1;
  for (std::size_t size = bytes.size() - 1; size > 0; size -= std::min(size, stride)) {
    std::filesystem::resize_file(file, size);
    ++counts[static_cast<int>(judge(file, written, digest))];
  }
  const std::uint64_t accepted_short = counts[1] + counts[2];
  counts[0] = counts[1] = counts[2] = 0;
  std::mt19937_64 engine(seed);
  for (std::uint64_t i = 0; i < flips; ++i) {
    std::string flipped = bytes;
    flipped[engine() % flipped.size()] ^= static_cast<char>(1U << (engine() % 8));
    write(file, flipped);
    ++counts[static_cast<int>(judge(file, written, digest))];
  }
  write(file, bytes);
  const bool sound = judge(file, written, digest) == Outcome::unchanged;
  std::filesystem::remove_all(folder);
  pastern::bench::printed(
      "journal: bytes; bit flips refused; without effect",
      std::to_string(bytes.size()) + "; " + std::to_string(counts[0]) + "; " + std::to_string(counts[1]));
  pastern::bench::promise("journal cut short at every byte: accepted", std::to_string(accepted_short), "0",
                          sound && accepted_short == 0);
  pastern::bench::promise("journal with a flipped bit: accepted with other content",
                          std::to_string(counts[2]), "0", sound && counts[2] == 0);
  return 0;
}
