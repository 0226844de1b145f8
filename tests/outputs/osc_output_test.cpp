#include "base/osc_message.hpp"
#include "base/refusal.hpp"
#include "outputs/osc_output.hpp"

#include <boost/asio/buffer.hpp>
#include <gtest/gtest.h>

namespace millpond {
namespace {

using boost::asio::ip::udp;

TEST(OscOutput, SendsOneMessageHighAndOneLow) {
    boost::asio::io_context context;
    udp::socket receiver(context, udp::endpoint(boost::asio::ip::address_v4::loopback(), 0));
    OutputSettings settings;
    settings.kind = OutputKind::osc;
    settings.port = receiver.local_endpoint().port();
    settings.address = "/stim/line";
    settings.high_arguments = "1 left";
    OscOutput output(settings);
    EXPECT_TRUE(output.set_line(true));
    EXPECT_TRUE(output.set_line(false));
    for (const auto& expected : {encode_osc("/stim/line", {std::int32_t{1}, std::string("left")}, "test"),
                                 encode_osc("/stim/line", {std::int32_t{0}}, "test")}) {
        std::vector<std::uint8_t> got(512);
        got.resize(receiver.receive(boost::asio::buffer(got)));
        EXPECT_EQ(got, expected);
    }
}

TEST(OscOutput, SaysWhenNobodyListensOnThisComputer) {
    OutputSettings settings;
    {
        boost::asio::io_context context;
        udp::socket taken(context, udp::endpoint(boost::asio::ip::address_v4::loopback(), 0));
        settings.port = taken.local_endpoint().port();
    } // free again: nobody listens
    OscOutput output(settings);
    output.set_line(false);
    bool told = false;
    for (int i = 0; i < 100 && !told; ++i) {
        told = !output.set_line(false);
    }
    EXPECT_TRUE(told);
}

TEST(OscOutput, OtherComputersNeedAnExplicitSetting) {
    OutputSettings settings;
    settings.host = "192.0.2.1"; // RFC 5737: for documentation, never reached
    EXPECT_THROW(OscOutput{settings}, Refusal);
    settings.host = "rig";
    EXPECT_THROW(OscOutput{settings}, Refusal);
}

} // namespace
} // namespace millpond
