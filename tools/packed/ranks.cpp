// Loads the part that sees MPI when mpirun says so by its environment.
#include "tools/packed/ranks.h"

#include <dlfcn.h>

#include <algorithm>
#include <array>
#include <cstdlib>
#include <cstring>
#include <exception>
#include <filesystem>
#include <limits>
#include <numeric>
#include <stdexcept>

#include "tools/packed/ranks_table.h"

namespace pastern::packed {
namespace {

constexpr const char* kLibrary = "libpastern_ranks.so";
constexpr int kInternal = 70;  // exit status

/// Beside the program, or in lib/ beside its folder.
std::string library_path() {
  std::error_code failed;
  const auto program = std::filesystem::read_symlink("/proc/self/exe", failed);
  if (failed) return kLibrary;
  const auto folder = program.parent_path();
  for (const auto& place : {folder / kLibrary, folder.parent_path() / "lib" / kLibrary}) {
    if (std::filesystem::exists(place, failed)) return place.string();
  }
  return kLibrary;
}

}  // namespace

struct Ranks::Impl {
  const pastern_ranks_table* mpi{nullptr};  // none: alone
  int rank{0};
  int count{1};
  int exceptions{std::uncaught_exceptions()};
};

std::unique_ptr<Ranks> Ranks::join(std::string& error) {
  auto impl = std::make_unique<Impl>();
  const char* started = std::getenv("OMPI_COMM_WORLD_SIZE");  // set by Open MPI's mpirun
  if (started == nullptr) return std::unique_ptr<Ranks>(new Ranks(std::move(impl)));
  const std::string path = library_path();
  // Global: parts that MPI loads later look for its names. Never unloaded: MPI cannot be started twice.
  void* library = dlopen(path.c_str(), RTLD_NOW | RTLD_GLOBAL);
  if (library == nullptr) {
    const char* why = dlerror();
    error = "started by mpirun with " + std::string(started) + " ranks, but " + path +
            " cannot be loaded: " + (why != nullptr ? why : "no reason given");
    return nullptr;
  }
  const auto entry =
      reinterpret_cast<const pastern_ranks_table* (*)()>(dlsym(library, "pastern_ranks_entry"));
  if (entry == nullptr || entry()->version != kPasternRanksVersion) {
    error = path + ": not of this program's version";
    return nullptr;
  }
  std::array<char, 160> why{};
  if (entry()->join(&impl->rank, &impl->count, why.data(), why.size()) != 0) {
    error = why.data();
    return nullptr;
  }
  impl->mpi = entry();
  return std::unique_ptr<Ranks>(new Ranks(std::move(impl)));
}

Ranks::Ranks(std::unique_ptr<Impl> impl) : impl_(std::move(impl)) {}

Ranks::~Ranks() {
  if (impl_->mpi == nullptr) return;
  if (std::uncaught_exceptions() > impl_->exceptions) impl_->mpi->abandon(kInternal);
  impl_->mpi->leave();
}

int Ranks::rank() const { return impl_->rank; }
int Ranks::count() const { return impl_->count; }

void Ranks::gather(const std::vector<int>& owner, std::size_t width, double* numbers) const {
  if (impl_->mpi == nullptr) return;
  if (owner.size() * width > static_cast<std::size_t>(std::numeric_limits<int>::max()) / sizeof(double)) {
    throw std::runtime_error("too many results for one gathering: " + std::to_string(owner.size()));
  }
  const auto ranks = static_cast<std::size_t>(count());
  const int row_bytes = static_cast<int>(width * sizeof(double));
  std::vector<double> mine;
  std::vector<int> bytes(ranks, 0);
  for (std::size_t row = 0; row < owner.size(); ++row) {
    bytes[static_cast<std::size_t>(owner[row])] += row_bytes;
    if (owner[row] == rank()) mine.insert(mine.end(), numbers + row * width, numbers + (row + 1) * width);
  }
  std::vector<int> places(ranks, 0);
  std::partial_sum(bytes.begin(), bytes.end() - 1, places.begin() + 1);
  std::vector<double> all(owner.size() * width);
  if (impl_->mpi->gather(mine.data(), all.data(), bytes.data(), places.data()) != 0) {
    throw std::runtime_error("MPI could not gather the results");
  }
  for (std::size_t row = 0; row < owner.size(); ++row) {
    int& place = places[static_cast<std::size_t>(owner[row])];
    std::copy_n(all.data() + static_cast<std::size_t>(place) / sizeof(double), width, numbers + row * width);
    place += row_bytes;
  }
}

std::vector<std::vector<unsigned char>> Ranks::all(const void* mine, std::size_t bytes) const {
  const auto* first = static_cast<const unsigned char*>(mine);
  if (impl_->mpi == nullptr) return {std::vector<unsigned char>(first, first + bytes)};
  const auto ranks = static_cast<std::size_t>(count());
  const std::vector<int> each(ranks, static_cast<int>(bytes));
  std::vector<int> places(ranks, 0);
  for (std::size_t r = 1; r < ranks; ++r) places[r] = places[r - 1] + static_cast<int>(bytes);
  std::vector<unsigned char> joined(ranks * bytes);
  if (impl_->mpi->gather(mine, joined.data(), each.data(), places.data()) != 0) {
    throw std::runtime_error("MPI could not compare the ranks");
  }
  std::vector<std::vector<unsigned char>> parts;
  for (std::size_t r = 0; r < ranks; ++r) {
    const auto* part = joined.data() + r * bytes;
    parts.emplace_back(part, part + bytes);
  }
  return parts;
}

bool Ranks::agree(std::string_view text) const {
  // Lengths first: what is gathered must have one length.
  const std::size_t length = text.size();
  const auto lengths = all(&length, sizeof(length));
  if (std::any_of(lengths.begin(), lengths.end(), [&](const auto& one) { return one != lengths.front(); })) {
    return false;
  }
  const auto texts = all(text.data(), text.size());
  return std::all_of(texts.begin(), texts.end(), [&](const auto& one) { return one == texts.front(); });
}

bool Ranks::any(bool here) const {
  const auto each = all(&here, sizeof(here));
  return std::any_of(each.begin(), each.end(), [](const auto& one) { return one[0] != 0; });
}

InstructionSet Ranks::common_set(InstructionSet own) const {
  InstructionSet least = own;
  for (const auto& one : all(&own, sizeof(own))) least = std::min(least, static_cast<InstructionSet>(one[0]));
  return least;
}

}  // namespace pastern::packed
