// The report from a made-up session: every walk is there, nothing comes from elsewhere, text and page tell
// the same.
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <regex>

#include "runtime/journal/journal.h"
#include "tests/tools/run.h"
#include "tests/tools/synthetic.h"

namespace pastern::testing {
namespace {

std::string contents(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(file), {}};
}

class ReportTest : public ::testing::Test {
 protected:
  void write(const Story& story) { ASSERT_TRUE(write_session(folder_.path(), story)); }
  /// The usual story, written once: each walk waits for the disk.
  void write_usual() {
    static Folder usual;
    static const bool written = write_session(usual.path(), Story{});
    ASSERT_TRUE(written);
    std::filesystem::copy(
        usual.path(), folder_.path(),
        std::filesystem::copy_options::recursive | std::filesystem::copy_options::overwrite_existing);
  }
  std::string page() {
    const std::string path = folder_.path() + "/page.html";
    const Ran ran = run({"report", "--journal", folder_.path(), "--out", path});
    EXPECT_EQ(ran.exit, 0) << ran.err;
    EXPECT_NE(ran.out.find(path), std::string::npos);
    return contents(path);
  }
  std::string text() {
    const Ran ran = run({"report", "--journal", folder_.path(), "--text"});
    EXPECT_EQ(ran.exit, 0) << ran.err;
    return ran.out.substr(0, ran.out.rfind("next: "));
  }
  Folder folder_;
};

TEST_F(ReportTest, PageComesFromNowhereElse) {
  write_usual();
  const std::string html = page();
  for (const char* word :
       {"http:", "https:", "//", "src=", "href=", "url(", "@import", "<script", "<link", "<iframe"}) {
    EXPECT_EQ(html.find(word), std::string::npos) << word;
  }
}

TEST_F(ReportTest, VerdictStandsFirst) {
  write_usual();
  const std::string read = text_of_page(page());
  const std::size_t verdict = read.find("Adopt the adapted policy");
  ASSERT_NE(verdict, std::string::npos);
  EXPECT_LT(verdict, read.find("Returns of the session"));
  EXPECT_LT(read.find("not a certified safety function"), read.find("Returns of the session"));
}

TEST_F(ReportTest, EveryWalkIsInTableAndPicture) {
  const Story story;
  write_usual();
  const std::string html = page();
  const std::size_t walks = 5 + story.search_walks + 2 * story.pairs;
  const std::size_t table = html.find("<table class=\"long\">");
  ASSERT_NE(table, std::string::npos);
  for (std::size_t walk = 1; walk <= walks; ++walk) {
    EXPECT_NE(html.find("<tr><td class=\"number\">" + std::to_string(walk) + "</td>", table),
              std::string::npos)
        << walk;
  }
  // First picture: a mark a walk, and seven in the legend.
  const std::string picture = html.substr(html.find("<svg"), html.find("</svg>") - html.find("<svg"));
  const std::regex mark("<path ");
  EXPECT_EQ(std::distance(std::sregex_iterator(picture.begin(), picture.end(), mark), std::sregex_iterator()),
            static_cast<std::ptrdiff_t>(walks + 7));
}

TEST_F(ReportTest, FallsAndVoidsAreCountedAndNamed) {
  write_usual();
  const std::string read = text();
  EXPECT_NE(read.find("70 walks counted: 1 fell, 1 left the lane; 1 void besides."), std::string::npos)
      << read;
  EXPECT_NE(read.find("somebody bumped it"), std::string::npos);
  EXPECT_NE(read.find("roll: 0.93 rad, limit 0.9 rad"), std::string::npos);
}

TEST_F(ReportTest, TextAndPageHoldTheSameNumbers) {
  for (const double gain : {0.6, 0.0}) {
    Folder folder;
    Story story;
    story.gain = gain;
    ASSERT_TRUE(write_session(folder.path(), story));
    const std::string path = folder.path() + "/page.html";
    ASSERT_EQ(run({"report", "--journal", folder.path(), "--out", path}).exit, 0);
    const Ran ran = run({"report", "--journal", folder.path(), "--text"});
    std::vector<std::string> in_text = numbers_in(ran.out.substr(0, ran.out.rfind("next: ")));
    std::vector<std::string> in_page = numbers_in(text_of_page(contents(path)));
    ASSERT_GT(in_text.size(), 71U * 12U);
    // Captions of pictures stand in the page only, and hold no number; the rest is the same, in the same
    // order.
    EXPECT_EQ(in_text, in_page);
  }
}

TEST_F(ReportTest, MeansAreThoseOfTheWalksInItsOwnTable) {
  write_usual();
  const std::vector<std::string> lines = lines_of(text());
  double sum = 0;
  int rows = 0;
  double told = 0;
  const std::regex walk("^ +[0-9]+ +confirm, adapted +completed +(-?[0-9.]+) .*");
  const std::regex mean("^ +confirmation, adapted policy +8 +0 +0 +(-?[0-9.]+) .*");
  for (const std::string& line : lines) {
    std::smatch match;
    if (std::regex_match(line, match, walk)) sum += std::stod(match[1]), ++rows;
    if (std::regex_match(line, match, mean)) told = std::stod(match[1]);
  }
  ASSERT_EQ(rows, 8);
  // Eight values rounded to 0.01 each: their mean is off by 0.005 at most, the told one by 0.005 again.
  EXPECT_NEAR(told, sum / rows, 0.0101);
}

TEST_F(ReportTest, HostileWordsStayWords) {
  Story story;
  story.void_reason = "<script>alert('x')</script> & \"so\"";
  write(story);
  const std::string html = page();
  EXPECT_EQ(html.find("<script"), std::string::npos);
  EXPECT_NE(html.find("&lt;script&gt;"), std::string::npos);
}

TEST_F(ReportTest, SessionWithoutConfirmationOrEndIsToldAsSuch) {
  Story story;
  story.confirm = false;
  write(story);
  EXPECT_NE(text().find("Keep the start policy: there was no confirmation."), std::string::npos);
  Folder other;
  story.end = false;
  story.search_walks = 0;
  ASSERT_TRUE(write_session(other.path(), story));
  const Ran ran = run({"report", "--journal", other.path(), "--text"});
  EXPECT_EQ(ran.exit, 0);
  EXPECT_NE(ran.out.find("No verdict: the session has not ended."), std::string::npos);
}

TEST_F(ReportTest, ClearlyWorseIsSaidAtTheHead) {
  Story story;
  story.search_walks = 0;
  story.gain = -0.6;
  write(story);
  EXPECT_NE(text().find("Keep the start policy: the adapted one walks worse."), std::string::npos);
}

TEST_F(ReportTest, ASimulatedRobotIsNotTakenForARealOne) {
  write_usual();
  const std::string real = text();
  EXPECT_EQ(real.find("simulated"), std::string::npos);
  EXPECT_NE(real.find("Not adopted yet. Next: pastern adopt"), std::string::npos);
  std::string error;
  const auto journal = journal::Journal::open(folder_.path(), error);
  ASSERT_TRUE(journal) << error;
  const std::string begun = "2026-03-01T10:00:00Z, simulated robot, stepped pace, by ida";
  ASSERT_TRUE(journal->put(journal::begun_key(1), begun).ok);
  const std::string simulated = text();
  EXPECT_NE(simulated.find(", begun " + begun), std::string::npos);
  EXPECT_NE(simulated.find("better on this simulated robot"), std::string::npos);
  EXPECT_NE(simulated.find("no proof for a real one"), std::string::npos);
}

TEST_F(ReportTest, WhereTheSessionRanIsNamedOnThePageInTheTextAndAsJson) {
  write_usual();
  std::string error;
  const auto told = [&](const std::string& on, const std::string& drives) {
    const auto journal = journal::Journal::open(folder_.path(), error);
    ASSERT_TRUE(journal) << error;
    ASSERT_TRUE(
        journal->put(journal::begun_key(1), "2026-03-01T10:00:00Z, " + on + ", wall pace, by ida").ok);
    ASSERT_TRUE(journal->put(journal::drives_key(1), drives).ok);
  };
  EXPECT_EQ(text().find("Walked on"), std::string::npos) << "a record that does not say";
  told("simulated robot", "simulated robot\nscenario=/sites/cold_store.scenario.txtpb;pace=wall");
  const std::string on_site = "Walked on: simulated robot, site cold_store.";
  EXPECT_NE(text().find(on_site), std::string::npos) << text();
  EXPECT_NE(text_of_page(page()).find(on_site), std::string::npos);
  EXPECT_NE(text().find("scenario=/sites/cold_store.scenario.txtpb;pace=wall"), std::string::npos);
  const auto json = [&] { return run({"report", "--journal", folder_.path(), "--json"}).out; };
  EXPECT_NE(json().find("\"simulated\": true"), std::string::npos) << json();
  EXPECT_NE(json().find("\"site\": \"cold_store\""), std::string::npos);
  told("simulated robot", "simulated robot\nsocket=/run/robot");
  EXPECT_NE(text().find("Walked on: simulated robot, site not named in its settings."), std::string::npos);
  told("real drives", "ring bus\nport=/dev/bus0");
  EXPECT_NE(text().find("Walked on: real drives (ring bus)."), std::string::npos) << text();
  EXPECT_NE(json().find("\"simulated\": false"), std::string::npos);
  EXPECT_NE(json().find("\"site\": \"\""), std::string::npos);
}

TEST_F(ReportTest, CostOfTransportSaysWhoseMassItIs) {
  write_usual();
  EXPECT_NE(text().find("cost of transport, by the robot file's mass"), std::string::npos);
  EXPECT_NE(text_of_page(page()).find("a load that the file does not know is not in it"), std::string::npos);
}

TEST_F(ReportTest, RealButTinyIsSaidAtTheHead) {
  for (const double gain : {0.03, -0.03, 0.3}) {
    Folder folder;
    Story story;
    story.search_walks = 0;
    story.gain = gain;
    story.even = true;
    ASSERT_TRUE(write_session(folder.path(), story));
    const std::string text = run({"report", "--journal", folder.path(), "--text"}).out;
    const bool tiny = std::abs(gain) < 0.05;
    EXPECT_NE(text.find(gain > 0 ? "Adopt the adapted policy" : "Keep the start policy"), std::string::npos);
    EXPECT_EQ(text.find("; real, but of no practical size.") != std::string::npos, tiny) << text;
    const std::string json = run({"report", "--journal", folder.path(), "--json"}).out;
    EXPECT_NE(json.find(tiny ? "\"of_no_practical_size\": true" : "\"of_no_practical_size\": false"),
              std::string::npos);
  }
}

TEST_F(ReportTest, WhatIsNotAJournalIsOneLineAndAFile) {
  const Ran none = run({"report", "--journal", folder_.path() + "/nowhere"});
  EXPECT_EQ(none.exit, 3);
  EXPECT_EQ(lines_of(none.err).size(), 1U) << none.err;
  std::ofstream(folder_.path() + "/pastern.journal") << "not a database";
  const Ran damaged = run({"report", "--journal", folder_.path()});
  EXPECT_EQ(damaged.exit, 3);
  EXPECT_EQ(lines_of(damaged.err).size(), 1U) << damaged.err;
}

TEST_F(ReportTest, SessionThatIsNotThereIsNamed) {
  write_usual();
  const Ran ran = run({"report", "--journal", folder_.path(), "--session", "4", "--text"});
  EXPECT_EQ(ran.exit, 3);
  EXPECT_NE(ran.err.find("no session 4, expected one of 1 to 1"), std::string::npos) << ran.err;
}

TEST_F(ReportTest, ReadingLeavesTheJournalUntouched) {
  write_usual();
  const std::string before = contents(folder_.path() + "/pastern.journal");
  (void)text();
  EXPECT_EQ(contents(folder_.path() + "/pastern.journal"), before);
}

TEST_F(ReportTest, PageThatCannotBeWrittenLeavesNothingBehind) {
  write_usual();
  const Ran ran =
      run({"report", "--journal", folder_.path(), "--out", folder_.path() + "/no/such/page.html"});
  EXPECT_EQ(ran.exit, 3);
  EXPECT_EQ(lines_of(ran.err).size(), 1U);
  EXPECT_FALSE(std::filesystem::exists(folder_.path() + "/no"));
}

}  // namespace
}  // namespace pastern::testing
