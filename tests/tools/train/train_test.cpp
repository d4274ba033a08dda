// `pastern train` as a function: a small one walks; threads and interruptions do not show in the file.
#include "tools/train/train.h"

#include <gtest/gtest.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>

#include "proto/files/artefact.h"
#include "proto/files/durable.h"
#include "proto/files/text.h"
#include "tests/proto/damage.h"
#include "tests/tools/train/robots.h"

namespace pastern::tools {
namespace {

namespace fs = std::filesystem;

class Train : public ::testing::Test {
 protected:
  void SetUp() override {
    std::string pattern = (fs::temp_directory_path() / "train.XXXXXX").string();
    ASSERT_NE(::mkdtemp(pattern.data()), nullptr);
    folder_ = pattern;
  }
  void TearDown() override { fs::remove_all(folder_); }

  [[nodiscard]] TrainOptions tiny(const std::string& out) const {
    TrainOptions options;
    options.robot = test::robot_path("dunlin8");
    options.out = (folder_ / out).string();
    options.settings.iterations = 4;
    options.settings.directions = 4;
    options.settings.look_every = 2;
    options.settings.look_walks = 4;
    options.walk_s = 0.5;
    options.last_look_walks = 8;
    options.threads = 1;
    options.software = "test";
    return options;
  }
  static std::string bytes(const std::string& path) {
    files::Defects defects;
    return files::read_whole(path, defects).value_or("");
  }
  static bool go_on(const TrainProgress&) { return true; }

  fs::path folder_;
};

TEST_F(Train, WritesTheSameFileOnOneThreadTwoThreadsAndAfterInterruptions) {
  files::Defects defects;
  ASSERT_TRUE(run_train(tiny("one.policy"), go_on, defects).finished) << files::lines(defects);
  TrainOptions two = tiny("two.policy");
  two.threads = 2;
  ASSERT_TRUE(run_train(two, go_on, defects).finished);
  const TrainOptions broken = tiny("broken.policy");
  const auto stop = [](const TrainProgress&) { return false; };
  int calls = 0;
  while (!fs::exists(broken.out) && calls < 10) {
    static_cast<void>(run_train(broken, stop, defects));
    ++calls;
  }
  EXPECT_EQ(calls, 4);  // an iteration each time
  EXPECT_TRUE(defects.empty()) << files::lines(defects);
  EXPECT_FALSE(bytes(broken.out).empty());
  EXPECT_EQ(bytes(tiny("one.policy").out), bytes(two.out));
  EXPECT_EQ(bytes(tiny("one.policy").out), bytes(broken.out));
  EXPECT_FALSE(fs::exists(broken.out + ".training"));
}

TEST_F(Train, TheFileCarriesItsProvenance) {
  files::Defects defects;
  const TrainResult result = run_train(tiny("p.policy"), go_on, defects);
  ASSERT_TRUE(result.finished) << files::lines(defects);
  const auto policy = files::read_policy(tiny("p.policy").out, test::robot("dunlin8"), defects);
  ASSERT_TRUE(policy) << files::lines(defects);
  const v1::Provenance& provenance = policy->policy().provenance();
  EXPECT_EQ(provenance.made_by(), "train");
  EXPECT_EQ(provenance.seed(), 1U);
  EXPECT_EQ(provenance.walks(), result.walks);
  EXPECT_EQ(result.walks, 4U * 8U + 2U * 4U);
  EXPECT_NE(provenance.text().find("arXiv:1910.01215"), std::string::npos);
  EXPECT_NE(provenance.text().find("seed 1, iterations 4"), std::string::npos);
  EXPECT_EQ(result.sha256_hex, files::hex(policy->sha256()));
}

TEST_F(Train, RefusesWrongFilesInOneLineAndWritesNothing) {
  const auto why = [](const TrainOptions& options) {
    files::Defects defects;
    EXPECT_FALSE(run_train(options, go_on, defects).finished);
    EXPECT_EQ(defects.size(), 1U) << files::lines(defects);
    return files::lines(defects);
  };
  TrainOptions options = tiny("x.policy");
  options.robot = (folder_ / "none.robot.txtpb").string();
  EXPECT_NE(why(options).find("No such file"), std::string::npos);
  EXPECT_FALSE(fs::exists(options.out));

  options = tiny("none/x.policy");
  EXPECT_NE(why(options).find("none/x.policy"), std::string::npos);

  options = tiny("x.policy");
  std::ofstream(options.out + ".training") << "no training";
  EXPECT_NE(why(options).find("x.policy.training"), std::string::npos);
  EXPECT_EQ(bytes(options.out + ".training"), "no training");
}

TEST_F(Train, RefusesToGoOnWithOtherSettingsOrAnotherRobot) {
  files::Defects defects;
  const auto stop = [](const TrainProgress&) { return false; };
  EXPECT_FALSE(run_train(tiny("x.policy"), stop, defects).finished);
  ASSERT_TRUE(defects.empty()) << files::lines(defects);
  TrainOptions other = tiny("x.policy");
  other.settings.seed = 2;
  EXPECT_FALSE(run_train(other, go_on, defects).finished);
  EXPECT_NE(files::lines(defects).find("settings: found a training with seed 1"), std::string::npos)
      << files::lines(defects);
  defects.clear();
  other = tiny("x.policy");
  other.robot = test::robot_path("dunlin12");
  EXPECT_FALSE(run_train(other, go_on, defects).finished);
  EXPECT_NE(files::lines(defects).find("a training of another robot file"), std::string::npos)
      << files::lines(defects);
  EXPECT_FALSE(fs::exists(other.out));
}

// A state file truncated anywhere or with a flipped bit is never taken.
TEST_F(Train, ADamagedStateIsRefused) {
  files::Defects none;
  const auto stop = [](const TrainProgress&) { return false; };
  const TrainOptions options = tiny("x.policy");
  EXPECT_FALSE(run_train(options, stop, none).finished);
  const std::string sound = bytes(options.out + ".training");
  ASSERT_FALSE(sound.empty());
  const auto tally = damage::damage_binary(sound, 1, 1000, [](const std::string& damaged, bool& said) {
    files::Defects defects;
    v1::Training training;
    const bool accepted = files::unpack_artefact(damaged, files::kTrainingKind, "t", training, defects);
    said = !defects.empty();
    return accepted;
  });
  EXPECT_EQ(tally.accepted, 0U);
  EXPECT_EQ(tally.silent, 0U);
}

// From nothing to a walk in some seconds: the trot alone stands about on its spot, the trained policy goes.
TEST_F(Train, ASmallTrainingSeesThePolicyWalk) {
  TrainOptions options = tiny("small.policy");
  options.robot = test::robot_path("dunlin12");
  options.settings.iterations = 24;
  options.settings.directions = 32;
  options.settings.step = 0.025;
  options.settings.last_step = 0.01;
  options.settings.look_every = 8;
  options.settings.look_walks = 24;
  options.walk_s = 2.5;
  options.last_look_walks = 40;
  options.threads = 2;
  files::Defects defects;
  const TrainResult result = run_train(options, go_on, defects);
  ASSERT_TRUE(result.finished) << files::lines(defects);
  EXPECT_GT(result.nominal.speed_m_per_s, 0.35);
  EXPECT_LE(result.nominal.falls, 0.05);
  EXPECT_GT(result.wide.speed_m_per_s, 0.2);
}

}  // namespace
}  // namespace pastern::tools
