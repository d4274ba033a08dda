// Damages every shipped file of every kind in every way and counts what is accepted although it should not
// be.
//   bench_file_damage [--seed N] [--quick]
// Crashes are counted too: each file is read in a process of its own.
#include <sys/wait.h>
#include <unistd.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <functional>
#include <memory>
#include <vector>

#include "pastern/v1/training.pb.h"
#include "proto/files/artefact.h"
#include "proto/files/plan_file.h"
#include "proto/files/policy_file.h"
#include "proto/files/scenario_file.h"
#include "proto/files/text.h"
#include "tests/bench/promise.h"
#include "tests/proto/damage.h"
#include "tests/proto/fixture.h"

namespace pastern {
namespace {

namespace fs = std::filesystem;

struct Tally {
  std::uint64_t tried{0};
  std::uint64_t accepted{0};
  std::uint64_t silent{0};
  std::uint64_t crashes{0};

  void operator+=(const Tally& other) {
    tried += other.tried;
    accepted += other.accepted;
    silent += other.silent;
    crashes += other.crashes;
  }
};

// Runs `work` in a child; a child that does not hand back its tally has crashed.
Tally in_a_child(const std::function<Tally()>& work) {
  int ends[2];
  if (::pipe(ends) != 0) throw std::runtime_error("pipe");
  const pid_t child = ::fork();
  if (child == 0) {
    const Tally tally = work();
    const bool sent = ::write(ends[1], &tally, sizeof tally) == static_cast<ssize_t>(sizeof tally);
    ::_exit(sent ? 0 : 1);
  }
  ::close(ends[1]);
  Tally tally;
  const bool got = ::read(ends[0], &tally, sizeof tally) == static_cast<ssize_t>(sizeof tally);
  ::close(ends[0]);
  int status = 0;
  ::waitpid(child, &status, 0);
  if (!got || !WIFEXITED(status) || WEXITSTATUS(status) != 0) tally.crashes = 1;
  return tally;
}

using TextReader = std::function<bool(const std::string& text, files::Defects& defects)>;

Tally damage_text(const std::string& text, const google::protobuf::Descriptor& message,
                  const TextReader& reads) {
  return in_a_child([&] {
    Tally tally;
    std::set<std::string> covered;
    for (const damage::Damaged& damaged : damage::damage_every_field(text, message, covered)) {
      files::Defects defects;
      const bool accepted = reads(damaged.text, defects);
      ++tally.tried;
      if (accepted && damaged.must_refuse) {
        ++tally.accepted;
        std::fprintf(stderr, "accepted: %s\n", damaged.what.c_str());
      }
      if (!accepted && defects.empty()) ++tally.silent;
    }
    return tally;
  });
}

// The printed form of a shipped file: one field a line, comments gone.
template <class Message>
std::string printed_form(const std::string& path) {
  files::Defects defects;
  Message message;
  const auto text = files::read_whole(path, defects);
  if (!text || !files::parse_text(*text, path, message, defects)) {
    throw std::runtime_error(files::lines(defects));
  }
  return fixture::text(message);
}

std::vector<std::string> shipped(const std::string& folder, const std::string& suffix) {
  std::vector<std::string> paths;
  const fs::path root = fs::path(PASTERN_SOURCE_DIR) / folder;
  if (!fs::exists(root)) return paths;
  for (const auto& entry : fs::directory_iterator(root)) {
    if (entry.path().string().ends_with(suffix)) paths.push_back(entry.path().string());
  }
  std::sort(paths.begin(), paths.end());
  return paths;
}

files::RobotFile shipped_robot(const std::string& name) {
  files::Defects defects;
  const auto robot = files::read_robot(
      std::string(PASTERN_SOURCE_DIR) + "/hal_stub/robots/" + name + ".robot.txtpb", defects);
  if (!robot) throw std::runtime_error(files::lines(defects));
  return *robot;
}

Tally text_kinds(bool quick) {
  Tally all;
  const TextReader robot = [](const std::string& text, files::Defects& defects) {
    return files::parse_robot(text, "damaged", defects).has_value();
  };
  const files::RobotFile walker = shipped_robot("dunlin12");
  const auto scenario_for = [](const files::RobotFile& of) -> TextReader {
    return [&of](const std::string& text, files::Defects& defects) {
      return files::parse_scenario(text, "damaged", of, defects).has_value();
    };
  };
  const TextReader plan = [](const std::string& text, files::Defects& defects) {
    return files::parse_plan(text, "damaged", defects).has_value();
  };
  all += damage_text(fixture::text(fixture::robot()), *v1::Robot::descriptor(), robot);
  all += damage_text(fixture::text(fixture::scenario()), *v1::Scenario::descriptor(),
                     scenario_for(fixture::robot_file()));
  all += damage_text(fixture::text(fixture::plan()), *v1::Plan::descriptor(), plan);
  if (quick) return all;
  for (const std::string& path : shipped("hal_stub/robots", ".robot.txtpb")) {
    all += damage_text(printed_form<v1::Robot>(path), *v1::Robot::descriptor(), robot);
  }
  for (const std::string& path : shipped("hal_stub/scenarios", ".scenario.txtpb")) {
    all += damage_text(printed_form<v1::Scenario>(path), *v1::Scenario::descriptor(), scenario_for(walker));
  }
  for (const std::string& path : shipped("tools/plans", ".plan.txtpb")) {
    all += damage_text(printed_form<v1::Plan>(path), *v1::Plan::descriptor(), plan);
  }
  return all;
}

Tally damage_policy(const std::string& bytes, const files::RobotFile& robot, std::uint64_t seed) {
  return in_a_child([&] {
    const auto tally = damage::damage_binary(bytes, seed, 1000, [&](const std::string& damaged, bool& said) {
      files::Defects defects;
      const bool accepted = files::parse_policy(damaged, "damaged", robot, defects).has_value();
      said = !defects.empty();
      return accepted;
    });
    return Tally{tally.tried, tally.accepted, tally.silent, 0};
  });
}

// The state of a training, as the trainer keeps it.
Tally damage_training(std::uint64_t seed) {
  v1::Training training;
  training.set_format(1);
  training.set_settings("seed 1");
  *training.mutable_policy() = fixture::policy();
  for (int i = 0; i < 50; ++i) training.add_centre(0.1 * i);
  const std::string bytes = files::pack_artefact(files::kTrainingKind, training);
  return in_a_child([&] {
    const auto tally = damage::damage_binary(bytes, seed, 1000, [](const std::string& damaged, bool& said) {
      files::Defects defects;
      v1::Training read;
      const bool accepted = files::unpack_artefact(damaged, files::kTrainingKind, "damaged", read, defects);
      said = !defects.empty();
      return accepted;
    });
    return Tally{tally.tried, tally.accepted, tally.silent, 0};
  });
}

Tally binary_kinds(std::uint64_t seed, bool quick) {
  Tally all = damage_policy(files::pack_policy(fixture::policy()), fixture::robot_file(), seed);
  all += damage_training(seed);
  if (quick) return all;
  for (const std::string& path : shipped("hal_stub/policies", ".policy")) {
    files::Defects defects;
    const std::string name = fs::path(path).stem().string();
    const auto bytes = files::read_whole(path, defects);
    if (!bytes) throw std::runtime_error(files::lines(defects));
    all += damage_policy(*bytes, shipped_robot(name), seed);
  }
  return all;
}

std::string shown(const Tally& tally) {
  return std::to_string(tally.crashes) + " / " + std::to_string(tally.accepted) + " of " +
         std::to_string(tally.tried) + ", " + std::to_string(tally.silent) + " silent";
}

bool holds(const Tally& tally) {
  return tally.tried > 0 && tally.crashes == 0 && tally.accepted == 0 && tally.silent == 0;
}

}  // namespace
}  // namespace pastern

int main(int argc, char** argv) {
  using namespace pastern;
  CLI::App app{"Damaged files: crashes and wrong acceptances"};
  std::uint64_t seed = 1;
  bool quick = false;
  app.add_option("--seed", seed, "seed of the bit flips");
  app.add_flag("--quick", quick, "small made-up files only");
  CLI11_PARSE(app, argc, argv);
  const Tally binary = binary_kinds(seed, quick);
  bench::promise("binary files truncated at every byte, 1 000 bit flips each: crash / accepted",
                 shown(binary), "0 / 0", holds(binary));
  const Tally text = text_kinds(quick);
  bench::promise("every field of every text file damaged: crash / accepted although out of range",
                 shown(text), "0 / 0", holds(text));
  return 0;
}
