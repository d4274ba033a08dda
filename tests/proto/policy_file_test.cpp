// A policy file against its robot: every part refused with its line, under a frame that is sound.
#include "proto/files/policy_file.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <limits>

#include "tests/proto/fixture.h"

namespace pastern::files {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInf = std::numeric_limits<double>::infinity();

using Change = std::function<void(v1::Policy&)>;

std::string why(const Change& change) {
  v1::Policy policy = fixture::policy();
  change(policy);
  Defects defects;
  return parse_policy(pack_policy(policy), "f", fixture::robot_file(), defects) ? "accepted" : lines(defects);
}

struct Case {
  const char* name;
  Change change;
  const char* expected;
};

class PolicyFileRefuses : public ::testing::TestWithParam<Case> {};

TEST_P(PolicyFileRefuses, WithItsLine) {
  const std::string text = why(GetParam().change);
  EXPECT_NE(text.find(GetParam().expected), std::string::npos) << text;
}

const Case kCases[] = {
    {"Format", [](v1::Policy& p) { p.set_format(2); }, "f: format: found 2, expected format 1\n"},
    {"NoFormat", [](v1::Policy& p) { p.clear_format(); }, "f: format: found 0"},
    {"NoName", [](v1::Policy& p) { p.clear_name(); }, "f: name: found 0 characters"},
    {"NameOfTwoLines", [](v1::Policy& p) { p.set_name("a\x07"); }, "f: name: found bytes that are no text"},
    {"OtherRobot", [](v1::Policy& p) { p.set_robot("other"); },
     "f: robot: found other, expected fixture10\n"},
    {"NoScalar", [](v1::Policy& p) { p.clear_scalar(); }, "f: scalar: found 0"},
    {"UnknownScalar", [](v1::Policy& p) { p.set_scalar(static_cast<v1::Policy::Scalar>(3)); },
     "f: scalar: found 3"},
    {"RateTooLow", [](v1::Policy& p) { p.set_rate_hz(4); }, "f: rate_hz: found 4, expected 5 to"},
    {"RateAboveTheCycle", [](v1::Policy& p) { p.set_rate_hz(2000); },
     "f: rate_hz: found 2000, expected 5 to"},
    {"RateDoesNotDivide", [](v1::Policy& p) { p.set_rate_hz(60); },
     "f: rate_hz: found 60, expected a rate that divides the robot's cycle_hz, 1000"},
    {"RateNan", [](v1::Policy& p) { p.set_rate_hz(kNan); }, "f: rate_hz: found nan"},
    {"GaitTooFast", [](v1::Policy& p) { p.set_gait_hz(10.1); }, "f: gait_hz: found 10.1"},
    {"GaitNan", [](v1::Policy& p) { p.set_gait_hz(kNan); }, "f: gait_hz: found nan"},
    {"NoChannels", [](v1::Policy& p) { p.clear_channels(); }, "f: channels: found 0 entries"},
    {"TooManyChannels",
     [](v1::Policy& p) {
       while (p.channels_size() < 513) *p.add_channels() = p.channels(0);
     },
     "f: channels: found 513 entries"},
    {"UnknownChannel",
     [](v1::Policy& p) { p.mutable_channels(0)->set_kind(static_cast<v1::Channel::Kind>(11)); },
     "f: channels[0].kind: found 11"},
    {"ChannelNotSaid", [](v1::Policy& p) { p.mutable_channels(0)->clear_kind(); },
     "f: channels[0].kind: found 0"},
    {"ChannelOfUnknownJoint", [](v1::Policy& p) { p.mutable_channels(2)->set_joint("wing"); },
     "f: channels[2].joint: found wing, expected a joint of fixture10"},
    {"JointWhereNoneBelongs", [](v1::Policy& p) { p.mutable_channels(1)->set_joint("front_left_hip"); },
     "f: channels[1].joint: found front_left_hip, expected nothing"},
    {"ChannelScaleZero", [](v1::Policy& p) { p.mutable_channels(0)->set_scale(0); },
     "f: channels[0].scale: found 0"},
    {"ChannelScaleInfinite", [](v1::Policy& p) { p.mutable_channels(0)->set_scale(kInf); },
     "f: channels[0].scale: found inf"},
    {"ChannelOffsetNan", [](v1::Policy& p) { p.mutable_channels(0)->set_offset(kNan); },
     "f: channels[0].offset: found nan"},
    {"NoLegs", [](v1::Policy& p) { p.clear_legs(); }, "f: legs: found 0 entries, expected 4"},
    {"UnknownLeg", [](v1::Policy& p) { p.mutable_legs(0)->set_leg("wing"); },
     "f: legs[0].leg: found wing, expected a leg of fixture10"},
    {"LegTwice", [](v1::Policy& p) { p.mutable_legs(1)->set_leg("front_left"); },
     "f: legs[1].leg: found front_left, said before"},
    {"LegAngleNan", [](v1::Policy& p) { p.mutable_legs(1)->set_angle_rad(kNan); },
     "f: legs[1].angle_rad: found nan"},
    {"LegLengthZero", [](v1::Policy& p) { p.mutable_legs(1)->set_length_m(0); },
     "f: legs[1].length_m: found 0"},
    {"AbductionMissing", [](v1::Policy& p) { p.mutable_legs(0)->set_abduction_rad(0); },
     "f: legs[0].abduction_rad: found 0"},
    {"AbductionWhereNoneIs", [](v1::Policy& p) { p.mutable_legs(3)->set_abduction_rad(0.1); },
     "f: legs[3].abduction_rad: found 0.1, expected 0"},
    {"NoLayers", [](v1::Policy& p) { p.clear_layers(); }, "f: layers: found 0 entries"},
    {"TooManyLayers",
     [](v1::Policy& p) {
       while (p.layers_size() < 9) *p.add_layers() = p.layers(1);
     },
     "f: layers: found 9 entries"},
    {"LayersDoNotChain", [](v1::Policy& p) { p.mutable_layers(1)->set_inputs(4); },
     "f: layers[1].inputs: found 4, expected 3"},
    {"FirstLayerNotAsWideAsTheChannels", [](v1::Policy& p) { p.mutable_layers(0)->set_inputs(6); },
     "f: layers[0].inputs: found 6, expected 5"},
    {"LayerTooWide", [](v1::Policy& p) { p.mutable_layers(0)->set_outputs(1025); },
     "f: layers[0].outputs: found 1025"},
    {"ActivationNotSaid", [](v1::Policy& p) { p.mutable_layers(0)->clear_activation(); },
     "f: layers[0].activation: found 0"},
    {"OutputsAreNotTheActions", [](v1::Policy& p) { p.mutable_layers(1)->set_outputs(9); },
     "f: layers: found 9 outputs, expected 10"},
    {"ParameterMissing", [](v1::Policy& p) { p.mutable_parameters()->RemoveLast(); },
     "f: parameters: found 47 numbers, expected 48"},
    {"ParameterTooMany", [](v1::Policy& p) { p.add_parameters(0); }, "f: parameters: found 49 numbers"},
    {"ParameterNan", [](v1::Policy& p) { p.set_parameters(7, kNan); }, "f: parameters[7]: found nan"},
    {"ParameterInfinite", [](v1::Policy& p) { p.set_parameters(7, -kInf); }, "f: parameters[7]: found -inf"},
    {"ParameterHuge", [](v1::Policy& p) { p.set_parameters(7, 1e300); }, "f: parameters[7]: found 1e+300"},
    {"NoGroups", [](v1::Policy& p) { p.clear_groups(); }, "f: groups: found 0 entries"},
    {"GroupOutside", [](v1::Policy& p) { p.mutable_groups(1)->set_count(31); },
     "f: groups[1]: found 18 to 49, expected a stretch of the 48 parameters"},
    {"GroupThatWouldWrapRound",
     [](v1::Policy& p) {
       p.mutable_groups(1)->set_first(4294967295U);
       p.mutable_groups(1)->set_count(20);
     },
     "f: groups[1]: found 4294967295 to 4294967315"},
    {"GroupEmpty", [](v1::Policy& p) { p.mutable_groups(0)->set_count(0); }, "f: groups[0]: found 0 to 0"},
    {"GroupsOverlap", [](v1::Policy& p) { p.mutable_groups(0)->set_count(19); },
     "f: groups[1]: found parameters of another group"},
    {"GroupNameTwice", [](v1::Policy& p) { p.mutable_groups(1)->set_name("hidden"); },
     "f: groups[1].name: found hidden, said before"},
    {"GroupScaleZero", [](v1::Policy& p) { p.mutable_groups(1)->set_perturbation_scale(0); },
     "f: groups[1].perturbation_scale: found 0"},
    {"GroupScaleNan", [](v1::Policy& p) { p.mutable_groups(1)->set_perturbation_scale(kNan); },
     "f: groups[1].perturbation_scale: found nan"},
    {"ParentTooShort", [](v1::Policy& p) { p.mutable_provenance()->set_parent_sha256("abc"); },
     "f: provenance.parent_sha256: found 3 bytes"},
};
INSTANTIATE_TEST_SUITE_P(Parts, PolicyFileRefuses, ::testing::ValuesIn(kCases),
                         [](const ::testing::TestParamInfo<Case>& one) { return one.param.name; });

TEST(PolicyFile, SoundIsAcceptedWithItsHash) {
  const std::string bytes = pack_policy(fixture::policy());
  Defects defects;
  const auto file = parse_policy(bytes, "f", fixture::robot_file(), defects);
  ASSERT_TRUE(file) << lines(defects);
  EXPECT_EQ(file->sha256(), sha256(bytes));
  EXPECT_EQ(file->bytes(), bytes);
  EXPECT_EQ(file->policy().parameters_size(), 48);
}

TEST(PolicyFile, AParentIsThirtyTwoBytes) {
  EXPECT_EQ(why([](v1::Policy& p) { p.mutable_provenance()->set_parent_sha256(raw(sha256("parent"))); }),
            "accepted");
}

}  // namespace
}  // namespace pastern::files
