#include "intake/open_source.hpp"

#include "intake/pipe_source.hpp"
#include "intake/rtp_source.hpp"
#include "packets.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

TEST(OpenSource, MakesTheKindThatTheSettingsAskFor) {
    auto settings = test::two_channels();
    const auto rtp = open_source(settings);
    EXPECT_NE(dynamic_cast<RtpSource*>(rtp.get()), nullptr);
    EXPECT_EQ(rtp->rate(), Hertz{1250.0});
    EXPECT_EQ(rtp->channels(), 2U);
    settings.source = SourceKind::pipe;
    settings.encoding = SampleEncoding::float32;
    const auto pipe = open_source(settings);
    EXPECT_NE(dynamic_cast<PipeSource*>(pipe.get()), nullptr);
    EXPECT_EQ(pipe->rate(), Hertz{1250.0});
    EXPECT_EQ(pipe->channels(), 2U);
}

} // namespace
} // namespace millpond
