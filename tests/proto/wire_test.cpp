// The wire format that our messages are written in, against known answers: Protocol Buffers' own encoding
// page (developers.google.com/protocol-buffers, "Encoding": 150, "testing", the sub-message, the packed
// field), the others made with protoc --encode.
#include <google/protobuf/descriptor.h>
#include <google/protobuf/descriptor.pb.h>
#include <google/protobuf/dynamic_message.h>
#include <google/protobuf/text_format.h>
#include <gtest/gtest.h>

#include "pastern/v1/policy.pb.h"
#include "proto/files/sha256.h"

namespace pastern::files {
namespace {

constexpr const char* kSchema = R"(
  name: "wire.proto" syntax: "proto3"
  message_type {
    name: "Wire"
    field { name: "number" number: 1 type: TYPE_INT32 label: LABEL_OPTIONAL }
    field { name: "words" number: 2 type: TYPE_STRING label: LABEL_OPTIONAL }
    field { name: "part" number: 3 type: TYPE_MESSAGE type_name: ".Wire" label: LABEL_OPTIONAL }
    field { name: "many" number: 4 type: TYPE_INT32 label: LABEL_REPEATED options { packed: true } }
    field { name: "zigzag" number: 5 type: TYPE_SINT32 label: LABEL_OPTIONAL }
    field { name: "fixed" number: 6 type: TYPE_FIXED32 label: LABEL_OPTIONAL }
    field { name: "far" number: 16 type: TYPE_FLOAT label: LABEL_OPTIONAL }
    field { name: "table" number: 17 type: TYPE_MESSAGE type_name: ".Wire.TableEntry" label: LABEL_REPEATED }
    nested_type {
      name: "TableEntry" options { map_entry: true }
      field { name: "key" number: 1 type: TYPE_STRING label: LABEL_OPTIONAL }
      field { name: "value" number: 2 type: TYPE_INT32 label: LABEL_OPTIONAL }
    }
  })";

class Wire : public ::testing::Test {
 protected:
  // Bytes of the message in this text, in hexadecimal; read back and written again they must be the same.
  std::string encoded(const std::string& text) {
    google::protobuf::FileDescriptorProto file;
    EXPECT_TRUE(google::protobuf::TextFormat::ParseFromString(kSchema, &file));
    google::protobuf::DescriptorPool pool;
    const auto* built = pool.BuildFile(file);
    google::protobuf::DynamicMessageFactory factory;
    const std::unique_ptr<google::protobuf::Message> message(
        factory.GetPrototype(built->message_type(0))->New());
    EXPECT_TRUE(google::protobuf::TextFormat::ParseFromString(text, message.get()));
    const std::string bytes = message->SerializeAsString();
    const std::unique_ptr<google::protobuf::Message> again(message->New());
    EXPECT_TRUE(again->ParseFromString(bytes));
    EXPECT_EQ(again->SerializeAsString(), bytes);
    return hex(std::string_view(bytes));
  }
};

TEST_F(Wire, VariableLengthNumbers) {
  EXPECT_EQ(encoded("number: 150"), "089601");
  EXPECT_EQ(encoded("number: 300"), "08ac02");
  EXPECT_EQ(encoded("number: 16384"), "08808001");
  EXPECT_EQ(encoded("number: -1"), "08ffffffffffffffffff01");
  EXPECT_EQ(encoded("number: 0"), "");
}

TEST_F(Wire, ZigzagNumbers) {
  EXPECT_EQ(encoded("zigzag: -1"), "2801");
  EXPECT_EQ(encoded("zigzag: 1"), "2802");
  EXPECT_EQ(encoded("zigzag: -2"), "2803");
  EXPECT_EQ(encoded("zigzag: 2147483647"), "28feffffff0f");
  EXPECT_EQ(encoded("zigzag: -2147483648"), "28ffffffff0f");
}

TEST_F(Wire, TextsAndPartsCarryTheirLength) {
  EXPECT_EQ(encoded("words: \"testing\""), "120774657374696e67");
  EXPECT_EQ(encoded("part { number: 150 }"), "1a03089601");
  EXPECT_EQ(encoded("many: [3, 270, 86942]"), "2206038e029ea705");
  EXPECT_EQ(encoded("table { key: \"x\" value: 7 }"), "8a01050a01781007");
}

TEST_F(Wire, FixedNumbersAreLittleEndian) {
  EXPECT_EQ(encoded("fixed: 1"), "3501000000");
  EXPECT_EQ(encoded("far: 1.5"), "85010000c03f");
}

// A policy file's parameters are packed doubles: tag 10 of wire type 2 is 0x52, IEEE 754 double of 0.1 is
// 3fb999999999999a.
TEST_F(Wire, PolicyParametersArePackedDoubles) {
  v1::Policy policy;
  policy.add_parameters(0.1);
  EXPECT_EQ(hex(std::string_view(policy.SerializeAsString())), "52089a9999999999b93f");
}

}  // namespace
}  // namespace pastern::files
