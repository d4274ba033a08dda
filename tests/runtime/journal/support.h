// Folders and walks for journal tests.
#pragma once

#include <gtest/gtest.h>

#include <filesystem>
#include <string>

#include "runtime/journal/journal.h"

namespace pastern::journal {

/// An empty folder of this test's own, removed at the end.
class Folder {
 public:
  Folder() {
    const auto* const test = testing::UnitTest::GetInstance()->current_test_info();
    path_ = testing::TempDir() + "pastern_journal_" + test->name() + "_" + std::to_string(getpid());
    std::filesystem::remove_all(path_);
    std::filesystem::create_directory(path_);
  }
  ~Folder() { std::filesystem::remove_all(path_); }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;

  [[nodiscard]] const std::string& path() const { return path_; }
  [[nodiscard]] std::string file() const { return path_ + "/pastern.journal"; }

 private:
  std::string path_;
};

inline std::unique_ptr<Journal> opened(const Folder& folder) {
  std::string error;
  auto journal = Journal::open(folder.path(), error);
  EXPECT_NE(journal, nullptr) << error;
  return journal;
}

/// The refusal's words; fails the test when there is none or it is more than one line.
inline std::string refusal(const std::string& folder, bool read_only = false, const std::string& vfs = "") {
  std::string error;
  EXPECT_EQ(Journal::open(folder, error, vfs, read_only), nullptr);
  EXPECT_FALSE(error.empty());
  EXPECT_EQ(error.find('\n'), std::string::npos) << error;
  return error;
}

inline v1::Episode episode(std::uint64_t session, std::uint64_t walk, double forward = 2.5) {
  v1::Episode e;
  e.set_session(session);
  e.set_walk(walk);
  e.set_part(v1::SEARCH);
  e.set_batch(3);
  e.set_index(static_cast<std::uint32_t>(walk));
  e.set_draw(0xFFFFFFFFFFFFFFF0U + walk);
  e.set_outcome(v1::COMPLETED);
  e.mutable_terms()->set_forward(forward);
  e.mutable_terms()->set_energy(-0.5);
  e.mutable_terms()->set_drift(-0.125);
  e.mutable_terms()->set_turn(-0.0625);
  e.mutable_summary()->set_distance_m(3.5);
  for (int i = 0; i < 250; ++i) e.mutable_trace()->add_roll_rad(0.01F * static_cast<float>(i));
  return e;
}

inline const Parameters kParameters{1.0, -2.5, 0.1, 1e-300};

inline SessionRow begun(Journal& journal) {
  SessionRow row;
  row.plan_text = "name: \"morning\"";
  row.robot_sha256_hex = std::string(64, 'a');
  row.start_policy_sha256_hex = std::string(64, 'b');
  row.start_parameters_sha256_hex = std::string(64, 'c');
  row.software = "test";
  const Written written = journal.begin_session(row);
  EXPECT_TRUE(written.ok) << written.words;
  return row;
}

inline void walk(Journal& journal, const v1::Episode& e, const Parameters& parameters = kParameters) {
  std::string why;
  EXPECT_TRUE(journal.commit(e, parameters, "state " + std::to_string(e.walk()), why).has_value()) << why;
}

}  // namespace pastern::journal
