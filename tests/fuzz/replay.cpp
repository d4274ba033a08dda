// A fuzzer's entry without a fuzzer: the seed files, and some thousand changes of each drawn from a fixed
// seed. Arguments: number of changes, then seed files or folders of them. With a compiler that has a fuzzer
// (PASTERN_FUZZ) this file is left out and the same entry runs for as long as one likes.
#include <algorithm>
#include <cstdint>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <random>
#include <sstream>
#include <string>
#include <vector>

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size);

namespace {

void run(const std::string& bytes) {
  LLVMFuzzerTestOneInput(reinterpret_cast<const std::uint8_t*>(bytes.data()), bytes.size());
}

std::string read_file(const std::filesystem::path& path) {
  std::ostringstream text;
  text << std::ifstream(path, std::ios::binary).rdbuf();
  return text.str();
}

/// One to four changes: a byte, a bit, a piece cut out, doubled or moved, the end cut off.
std::string changed(std::string bytes, std::mt19937_64& random) {
  const auto below = [&](std::size_t n) { return n == 0 ? 0 : random() % n; };
  for (std::size_t n = 1 + below(4); n > 0 && !bytes.empty(); --n) {
    const std::size_t at = below(bytes.size());
    const std::size_t length = 1 + below(std::min<std::size_t>(64, bytes.size() - at));
    switch (below(6)) {
      case 0:
        bytes[at] = static_cast<char>(random());
        break;
      case 1:
        bytes[at] = static_cast<char>(bytes[at] ^ (1 << below(8)));
        break;
      case 2:
        bytes.erase(at, length);
        break;
      case 3:
        bytes.insert(below(bytes.size()), bytes.substr(at, length));
        break;
      case 4:
        bytes.resize(at);
        break;
      default:
        for (std::size_t i = at; i < at + length; ++i) bytes[i] = static_cast<char>(random());
    }
  }
  return bytes;
}

/// From nothing, for entries that read their input as numbers.
std::string drawn(std::mt19937_64& random) {
  std::string bytes(random() % 4096, '\0');
  for (char& byte : bytes) byte = static_cast<char>(random());
  return bytes;
}

}  // namespace

int main(int argc, char** argv) {
  if (argc < 2) {
    std::fprintf(stderr, "usage: %s CHANGES [SEED FILE]...\n", argv[0]);
    return 2;
  }
  const int changes = std::atoi(argv[1]);
  std::vector<std::string> seeds;
  for (int i = 2; i < argc; ++i) seeds.push_back(read_file(argv[i]));
  std::mt19937_64 random(20261201);
  run({});
  for (const std::string& seed : seeds) run(seed);
  for (int i = 0; i < changes; ++i) {
    const bool from_seed = !seeds.empty() && i % 8 != 0;
    run(from_seed ? changed(seeds[static_cast<std::size_t>(i) % seeds.size()], random) : drawn(random));
  }
  std::printf("%zu seeds, %d changes\n", seeds.size(), changes);
  return 0;
}
