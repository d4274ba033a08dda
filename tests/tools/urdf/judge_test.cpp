// What is wrong with a URDF file is told in one line each, with the element's name and what was expected.
#include <algorithm>

#include "tests/tools/run.h"
#include "tests/tools/urdf/stilt.h"

namespace pastern::testing {
namespace {

struct Fault {
  const char* from;
  const char* to;
  const char* line;  ///< begins so after the file's name, and is the only one
};

class OneFault : public ::testing::TestWithParam<Fault> {};

TEST_P(OneFault, IsOneLineThatNamesTheElement) {
  const std::string lines = refused(stilt_with(GetParam().from, GetParam().to));
  EXPECT_EQ(std::count(lines.begin(), lines.end(), '\n'), 1) << lines;
  EXPECT_EQ(lines.rfind(std::string("stilt.urdf: ") + GetParam().line, 0), 0U) << lines;
  EXPECT_NE(lines.find(", expected "), std::string::npos) << lines;
}

INSTANTIATE_TEST_SUITE_P(
    Masses, OneFault,
    ::testing::Values(
        Fault{"<mass value=\"0.8\"/>", "<mass value=\"0\"/>",
              "link left_thigh (line 14) mass: found 0, expected a mass above 0"},
        Fault{"<mass value=\"4\"/>", "<mass value=\"-4\"/>", "link deck (line 3) mass: found -4"},
        Fault{"<mass value=\"4\"/>", "<mass value=\"nan\"/>", "link deck (line 3) mass value: found \"nan\""},
        Fault{"<mass value=\"4\"/>", "<mass value=\"1e999\"/>",
              "link deck (line 3) mass value: found \"1e999\""},
        Fault{"<mass value=\"4\"/>", "<mass value=\"4 kg\"/>",
              "link deck (line 3) mass value: found \"4 kg\""},
        Fault{"<mass value=\"4\"/>", "<mass value=\"4000\"/>", "trunk.link.mass_kg: found 4001"},
        Fault{"<mass value=\"4\"/>", "", "link deck (line 3) mass: found nothing"}));

INSTANTIATE_TEST_SUITE_P(
    Inertias, OneFault,
    ::testing::Values(Fault{"ixx=\"0.03\" iyy=\"0.05\" izz=\"0.06\" ixy=\"0.001\" ixz=\"0\" iyz=\"-0.002\"",
                            "ixx=\"0\" iyy=\"0\" izz=\"0\" ixy=\"0\" ixz=\"0\" iyz=\"0\"",
                            "link deck (line 3) inertia: found all zero"},
                      Fault{
                          "izz=\"0.06\"", "izz=\"0.09\"",
                          "link deck (line 3) inertia: found a moment of 0.09, the other two together 0.08"},
                      Fault{"ixx=\"0.03\"", "ixx=\"-0.03\"", "link deck (line 3) inertia ixx: found -0.03"},
                      Fault{"iyz=\"-0.002\"", "iyz=\"-0.05\"",
                            "link deck (line 3) inertia: found products ixy, ixz, iyz too large"},
                      Fault{"ixx=\"0.03\" iyy=\"0.05\" izz=\"0.06\" ixy=\"0.001\" ixz=\"0\" iyz=\"-0.002\"",
                            "ixx=\"1\" iyy=\"1\" izz=\"2\" ixy=\"-1\" ixz=\"0\" iyz=\"0\"",
                            "link deck (line 3) inertia: found no moment about one direction"},
                      Fault{"izz=\"0.06\"", "izz=\"much\"", "link deck (line 3) inertia izz: found \"much\""},
                      Fault{"izz=\"0.06\"", "", "link deck (line 3) inertia izz: found nothing"}));

INSTANTIATE_TEST_SUITE_P(
    Joints, OneFault,
    ::testing::Values(
        Fault{
            "name=\"left_hip\" type=\"revolute\"", "name=\"left_hip\" type=\"planar\"",
            "joint left_hip (line 18) type: found planar, expected revolute, continuous, prismatic or fixed"},
        Fault{"type=\"revolute\"", "type=\"floating\"", "joint left_hip (line 18) type: found floating"},
        Fault{"type=\"revolute\"", "type=\"ball\"", "joint left_hip (line 18) type: found ball"},
        Fault{"type=\"revolute\"", "", "joint left_hip (line 18) type: found nothing"},
        Fault{"<axis xyz=\"0 2 0\"/>", "<axis xyz=\"0 0 0\"/>",
              "joint left_hip (line 18) axis: found length 0"},
        Fault{"<axis xyz=\"0 2 0\"/>", "<axis xyz=\"0 2\"/>", "joint left_hip (line 18) axis: found \"0 2\""},
        Fault{"<axis xyz=\"1 1 0\"/>", "<axis xyz=\"1 1 0\"/><mimic joint=\"left_hip\"/>",
              "joint left_knee (line 25) mimic: found"},
        Fault{"<limit lower=\"-1\" upper=\"2\" effort=\"30\" velocity=\"12\"/>", "",
              "joint left_hip (line 18) limit: found nothing"},
        Fault{"lower=\"-1\" upper=\"2\"", "lower=\"2\" upper=\"-1\"",
              "joint left_hip (line 18) limit: found lower 2, upper -1"},
        Fault{"lower=\"-1\" upper=\"2\"", "", "joint left_hip (line 18) limit: found lower 0, upper 0"},
        Fault{"lower=\"-1\" upper=\"2\"", "lower=\"-1\" upper=\"200\"",
              "joint left_hip.angle_max_rad: found 200"},
        Fault{"effort=\"30\"", "effort=\"0\"", "joint left_hip (line 18) limit effort: found 0"},
        Fault{"velocity=\"12\"", "velocity=\"-1\"", "joint left_hip (line 18) limit velocity: found -1"},
        Fault{"effort=\"30\"", "", "joint left_hip (line 18) limit effort: found nothing"}));

INSTANTIATE_TEST_SUITE_P(
    Trees, OneFault,
    ::testing::Values(
        Fault{"<parent link=\"deck\"/><child link=\"right_thigh\"/>",
              "<parent link=\"deck\"/><child link=\"leg\"/>",
              "joint right_hip (line 33) child: found leg, expected the name of a link"},
        Fault{"<parent link=\"mast\"/>", "", "joint tail_slide (line 39) parent: found nothing"},
        Fault{"<parent link=\"deck\"/><child link=\"right_thigh\"/>",
              "<parent link=\"deck\"/><child link=\"left_shank\"/>",
              "link left_shank (line 21): found two joints that carry it: left_knee and right_hip"},
        Fault{"<link name=\"left_foot\"/>", "<link name=\"left_foot\"/><link name=\"loose\"/>",
              "robot: found 2 links that no joint carries: deck, loose, expected one, the trunk"},
        Fault{"<link name=\"left_foot\"/>", "<link name=\"left_foot\"/><link name=\"deck\"/>",
              "link deck (line 27): found a link of this name before"},
        Fault{"<joint name=\"tail_slide\"", "<joint name=\"left_hip\"",
              "joint left_hip (line 39): found a joint of this name before"},
        Fault{"name=\"stilt\"", "", "robot: found no name"},
        Fault{"<link name=\"left_foot\"/>", "<link name=\"left_foot\"/><link/>",
              "link without a name (line 27): found no name"}));

INSTANTIATE_TEST_SUITE_P(Documents, OneFault,
                         ::testing::Values(Fault{"</robot>", "", "line"},
                                           Fault{"</robot>\n", "</robot>\n<robot name=\"twin\"/>",
                                                 "line 43: found a second element at the top"},
                                           Fault{"<?xml version=\"1.0\"?>\n<robot name=\"stilt\">",
                                                 "<a/><robot name=\"stilt\">", "found an element a"}));

TEST(Urdf, AllFaultsAreToldAtOnce) {
  std::string text = stilt_with("<mass value=\"4\"/>", "<mass value=\"-4\"/>");
  for (const auto& [from, to] :
       {std::pair("type=\"continuous\"", "type=\"planar\""), std::pair("effort=\"50\"", "effort=\"0\""),
        std::pair("xyz=\"0 2 0\"", "xyz=\"0 0 0\"")}) {
    text.replace(text.find(from), std::string(from).size(), to);
  }
  EXPECT_EQ(lines_of(refused(text)).size(), 4U) << refused(text);
}

TEST(Urdf, BodiesOfShapesOnlyAreRefusedAndFramesThatAreFixedAreNot) {
  const std::string lines = refused(R"(<robot name="husk">
    <link name="shell"><visual><geometry><mesh filename="shell.stl"/></geometry></visual></link>
    <link name="arm"><visual><geometry><mesh filename="arm.stl"/></geometry></visual></link>
    <link name="hand"/><link name="frame"/>
    <joint name="a" type="continuous"><parent link="shell"/><child link="arm"/></joint>
    <joint name="b" type="continuous"><parent link="arm"/><child link="hand"/></joint>
    <joint name="c" type="fixed"><parent link="hand"/><child link="frame"/></joint></robot>)");
  EXPECT_EQ(lines,
            "stilt.urdf: link shell (line 2): found shapes only, no inertial element, expected mass and "
            "inertia of a "
            "body that moves\n"
            "stilt.urdf: link arm (line 3): found shapes only, no inertial element, expected mass and "
            "inertia of a body "
            "that moves\n"
            "stilt.urdf: link hand (line 4): found no inertial element, expected mass and inertia of a body "
            "that moves\n");
}

TEST(Urdf, NoLinksIsRefused) {
  EXPECT_EQ(refused("<robot name=\"nil\"/>"),
            "stilt.urdf: robot: found no links, expected a trunk and the links of its legs\n");
}

/// `count` links in a chain of continuous joints, the last of them also carrying `back` when it is said.
std::string chain(int count, const std::string& back = "") {
  std::string text = "<robot name=\"chain\">";
  for (int i = 0; i <= count; ++i) {
    const std::string n = std::to_string(i);
    text += "<link name=\"l" + n +
            "\"><inertial><mass value=\"1\"/><inertia ixx=\"1\" iyy=\"1\" izz=\"1\" ixy=\"0\" "
            "ixz=\"0\" iyz=\"0\"/></inertial></link>";
    if (i == 0) continue;
    text += "<joint name=\"j" + n + "\" type=\"continuous\"><parent link=\"l" + std::to_string(i - 1) +
            "\"/><child link=\"l" + n + "\"/></joint>";
  }
  if (!back.empty()) {
    text += "<joint name=\"back\" type=\"continuous\"><parent link=\"l" + std::to_string(count) +
            "\"/><child link=\"" + back + "\"/></joint>";
  }
  return text + "</robot>";
}

TEST(Urdf, MoreThan32JointsAreRefused) {
  EXPECT_EQ(refused(chain(32)), "");
  EXPECT_EQ(refused(chain(33)), "stilt.urdf: robot: found 33 joints that move, expected 2 to 32\n");
  EXPECT_EQ(refused(chain(1)), "stilt.urdf: robot: found 1 joints that move, expected 2 to 32\n");
}

TEST(Urdf, LoopsAreRefusedWhereverTheyClose) {
  EXPECT_NE(refused(chain(4, "l0")).find("robot: found every link carried by a joint: a closed loop"),
            std::string::npos);
  EXPECT_NE(refused(chain(4, "l2")).find("link l2 (line 1): found two joints that carry it: j2 and back"),
            std::string::npos);
  // A ring beside the tree: each of its links has one joint that carries it, and none leads there.
  std::string ring = chain(3);
  const std::string first = "<parent link=\"l0\"/><child link=\"l1\"/>";
  ring.replace(ring.find(first), first.size(), "<parent link=\"l3\"/><child link=\"l1\"/>");
  EXPECT_EQ(lines_of(refused(ring)).size(), 3U) << refused(ring);
  EXPECT_NE(refused(ring).find("link l2 (line 1): found no way to it from l0: it is part of a closed loop"),
            std::string::npos);
}

TEST(Urdf, WhatTheXmlLibraryCouldNotBearIsRefusedBefore) {
  std::string deep;
  for (int i = 0; i < 200000; ++i) deep += "<a>";
  EXPECT_EQ(refused(deep), "stilt.urdf: found elements nested deeper than 100, expected a URDF document\n");
  EXPECT_EQ(refused(std::string("<robot name=\"x\">\0</robot>", 25)),
            "stilt.urdf: found a zero byte, expected XML text\n");
  EXPECT_EQ(lines_of(refused("")).size(), 1U);
  EXPECT_EQ(lines_of(refused("no xml at all")).size(), 1U);
}

TEST(Urdf, OriginThatIsNoPlaceIsToldInTheParsersWords) {
  const std::string lines = refused(stilt_with("<origin xyz=\"0 0 -0.22\"", "<origin xyz=\"0 zero -0.22\""));
  EXPECT_NE(lines.find("zero"), std::string::npos) << lines;
}

TEST(Urdf, EveryCutIsRefusedAndNoByteTurnedIsFatal) {
  const std::string whole = stilt();
  for (std::size_t cut = 0; cut + 10 < whole.size(); cut += 37) {
    EXPECT_NE(refused(whole.substr(0, cut)), "") << cut;
  }
  for (std::size_t at = 0; at < whole.size(); at += 11) {
    std::string turned = whole;
    turned[at] = static_cast<char>(turned[at] ^ (1 << (at % 8)));
    for (const char c : refused(turned)) EXPECT_TRUE(c == '\n' || static_cast<unsigned char>(c) >= 0x20);
  }
}

}  // namespace
}  // namespace pastern::testing
