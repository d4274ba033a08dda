// SHA-256 known answers.
#include "proto/files/sha256.h"

#include <gtest/gtest.h>

namespace pastern::files {
namespace {

// FIPS 180-4 and NIST's example values: the empty message, "abc", and the message of 448 bits; the middle of
// the first is from memory and was confirmed with coreutils' sha256sum.
TEST(Sha256Digest, MatchesThePublishedExamples) {
  EXPECT_EQ(hex(sha256("")), "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
  EXPECT_EQ(hex(sha256("abc")), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  EXPECT_EQ(hex(sha256("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq")),
            "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
}

// FIPS 180-4 example: a million times "a" (from memory, confirmed with coreutils' sha256sum).
TEST(Sha256Digest, MatchesForAMillionLetters) {
  EXPECT_EQ(hex(sha256(std::string(1'000'000, 'a'))),
            "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
}

TEST(Sha256Digest, RawAndHexNameTheSameBytes) {
  const Sha256 digest = sha256("abc");
  EXPECT_EQ(raw(digest).size(), 32U);
  EXPECT_EQ(hex(raw(digest)), hex(digest));
  EXPECT_EQ(hex(std::string_view("\x00\xff\x0a", 3)), "00ff0a");
}

}  // namespace
}  // namespace pastern::files
