#include "base/osc_message.hpp"
#include "base/refusal.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using Bytes = std::vector<std::uint8_t>;

Bytes bytes_of(std::string_view text) {
    return {text.begin(), text.end()};
}

// The Open Sound Control 1.0 Specification's own worked example: "/oscillator/4/frequency" with the float32 440.0.
const Bytes specification_example = bytes_of(std::string_view("/oscillator/4/frequency\0,f\0\0\x43\xdc\0\0", 32));

TEST(OscMessage, EncodesTheSpecificationsExample) {
    EXPECT_EQ(encode_osc("/oscillator/4/frequency", {440.0F}, "test"), specification_example);
}

TEST(OscMessage, DecodesTheSpecificationsExample) {
    OscMessage message;
    ASSERT_EQ(decode_osc(specification_example, message), OscTrouble::none);
    EXPECT_EQ(message.address, "/oscillator/4/frequency");
    ASSERT_EQ(message.count, 1U);
    EXPECT_EQ(message.values[0].type, 'f');
    EXPECT_EQ(message.values[0].number, 440.0F);
}

// The specification's second example: "/foo" with 1000, -1, "hello", 1.234, 5.678.
TEST(OscMessage, EncodesTheSpecificationsSecondExample) {
    const Bytes expected = bytes_of(std::string_view("/foo\0\0\0\0,iisff\0\0\0\0\x03\xe8\xff\xff\xff\xff"
                                                     "hello\0\0\0\x3f\x9d\xf3\xb6\x40\xb5\xb2\x2d",
                                                     40));
    EXPECT_EQ(encode_osc("/foo", {std::int32_t{1000}, std::int32_t{-1}, std::string("hello"), 1.234F, 5.678F}, "test"),
              expected);
}

TEST(OscMessage, EveryCutOfAMessageIsRefusedAndNeverReadBeyond) {
    const auto whole = encode_osc("/gate", {std::string("immobile"), std::int32_t{1}}, "test");
    for (std::size_t length = 0; length < whole.size(); ++length) {
        const Bytes cut(whole.begin(),
                        whole.begin() + static_cast<std::ptrdiff_t>(length)); // exact size: sanitizers see an overrun
        OscMessage message;
        EXPECT_NE(decode_osc(cut, message), OscTrouble::none) << length;
    }
}

TEST(OscMessage, SaysWhatIsWrong) {
    OscMessage message;
    EXPECT_EQ(decode_osc(bytes_of(std::string_view("#bundle\0", 8)), message), OscTrouble::not_a_message);
    EXPECT_EQ(decode_osc(bytes_of(std::string_view("/a\0\0", 4)), message), OscTrouble::no_type_tags);
    EXPECT_EQ(decode_osc(bytes_of(std::string_view("/a\0\0,b\0\0", 8)), message), OscTrouble::unknown_type);
    EXPECT_EQ(decode_osc(bytes_of(std::string_view("/a\0\0,TTTTTTTTT\0\0", 16)), message), OscTrouble::too_many);
}

TEST(OscMessage, WordsOfSettingsBecomeTypedArguments) {
    const auto arguments = osc_arguments("1 2.5 rise");
    ASSERT_EQ(arguments.size(), 3U);
    EXPECT_EQ(std::get<std::int32_t>(arguments[0]), 1);
    EXPECT_EQ(std::get<float>(arguments[1]), 2.5F);
    EXPECT_EQ(std::get<std::string>(arguments[2]), "rise");
}

TEST(OscMessage, RefusesAddressesThatOscReserves) {
    for (const auto* address : {"", "line", "/", "/a b", "/a*", "/a{b}"}) {
        EXPECT_THROW((void)encode_osc(address, {}, "output.address"), Refusal) << address;
    }
}

} // namespace
} // namespace millpond
