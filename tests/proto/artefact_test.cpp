// The frame of the binary files.
#include "proto/files/artefact.h"

#include <gtest/gtest.h>

#include "proto/files/policy_file.h"
#include "tests/proto/damage.h"
#include "tests/proto/fixture.h"

namespace pastern::files {
namespace {

std::string why(const std::string& bytes, std::string_view kind = kPolicyKind) {
  v1::Policy policy;
  Defects defects;
  return unpack_artefact(bytes, kind, "f.policy", policy, defects) ? "accepted" : lines(defects);
}

// The documented bytes, counted out by hand for a message with one field (format: 1 -> 08 01).
TEST(Artefact, HasTheDocumentedBytes) {
  v1::Policy policy;
  policy.set_format(1);
  const std::string bytes = pack_artefact("PLCY", policy);
  const std::string head("PASTERN\x01PLCY\x02\0\0\0\0\0\0\0\x08\x01", 22);
  EXPECT_EQ(bytes.substr(0, 22), head);
  EXPECT_EQ(bytes.substr(22), raw(sha256(head)));
  EXPECT_EQ(why(bytes), "accepted");
}

TEST(Artefact, RoundTripGivesTheMessageAndTheSameBytes) {
  const std::string bytes = pack_artefact(kPolicyKind, fixture::policy());
  v1::Policy policy;
  Defects defects;
  ASSERT_TRUE(unpack_artefact(bytes, kPolicyKind, "f", policy, defects)) << lines(defects);
  EXPECT_EQ(policy.SerializeAsString(), fixture::policy().SerializeAsString());
  EXPECT_EQ(pack_artefact(kPolicyKind, policy), bytes);
}

TEST(Artefact, EachPartOfTheFrameIsRefusedWithItsLine) {
  const std::string sound = pack_artefact(kPolicyKind, fixture::policy());
  std::string bytes = sound;
  bytes[0] = 'p';
  EXPECT_EQ(why(bytes), "f.policy: found no Pastern file, expected magic PASTERN\n");
  bytes = sound;
  bytes[7] = 2;
  EXPECT_EQ(why(bytes), "f.policy: found frame version 2, expected frame version 1\n");
  EXPECT_EQ(why(sound, kPriorKind), "f.policy: found kind \"PLCY\", expected kind \"PRIO\"\n");
  EXPECT_EQ(why(""), "f.policy: found 0 bytes, expected a PLCY file of at least 52\n");
  EXPECT_NE(why(sound + "x").find("no more"), std::string::npos);
  bytes = sound;
  bytes[19] = '\xff';  // a length of more than any memory
  EXPECT_NE(why(bytes).find("a payload of "), std::string::npos);
  bytes = sound;
  bytes.back() = static_cast<char>(bytes.back() ^ 1);
  EXPECT_EQ(why(bytes), "f.policy: found a checksum that does not fit, expected an undamaged file\n");
}

TEST(Artefact, ASoundFrameAroundAPayloadThatDoesNotParseIsRefused) {
  std::string bytes("PASTERN\x01PLCY\x02\0\0\0\0\0\0\0\x52\x7f", 22);  // parameters said to be 127 bytes long
  bytes += raw(sha256(bytes));
  EXPECT_NE(why(bytes).find("a payload that does not parse"), std::string::npos);
}

// 1 000 flips with each of three seeds; a flip may hit any byte of the file.
TEST(Artefact, TruncatedAnywhereOrFlippedAnywhereIsNeverAcceptedAndNeverSilent) {
  const std::string bytes = pack_policy(fixture::policy());
  Defects none;
  ASSERT_TRUE(parse_policy(bytes, "f", fixture::robot_file(), none)) << lines(none);
  for (const std::uint64_t seed : {1U, 2U, 3U}) {
    const auto tally = damage::damage_binary(bytes, seed, 1000, [](const std::string& damaged, bool& said) {
      Defects defects;
      const bool accepted = parse_policy(damaged, "f", fixture::robot_file(), defects).has_value();
      said = !defects.empty();
      return accepted;
    });
    EXPECT_EQ(tally.tried, bytes.size() + 64 + 1000);
    EXPECT_EQ(tally.accepted, 0U);
    EXPECT_EQ(tally.silent, 0U);
  }
}

}  // namespace
}  // namespace pastern::files
