#include "audit/output_figures.hpp"
#include "audit/session_figures.hpp"
#include "journal/session_tables.hpp"

#include <gtest/gtest.h>

#include <algorithm>

namespace millpond {
namespace {

Event end_of(std::uint16_t output, bool marker, std::uint64_t sample, std::int64_t width_ns, std::int64_t late_ns) {
    return Event::make(EventKind::pulse_end, 0, SampleIndex{sample},
                       PulseEndDetail{width_ns, late_ns, output, static_cast<std::uint16_t>(marker ? 1 : 0)});
}

Event device(std::uint16_t output, bool marker, const std::string& name, DeviceState state) {
    DeviceDetail detail{output, static_cast<std::uint16_t>(marker ? 1 : 0), {}};
    name.copy(detail.name.data(), detail.name.size() - 1);
    return Event::make(EventKind::device, static_cast<std::uint8_t>(state), SampleIndex{0}, detail);
}

/// A marker first in settings, then two lines of different width; one pulse, and one trigger without.
std::vector<Event> session() {
    return {device(0, true, "marker", DeviceState::ready),
            device(1, false, "laser", DeviceState::ready),
            device(2, false, "lamp", DeviceState::ready),
            Event::make(EventKind::pulse, 0, SampleIndex{100}, PulseDetail{}),
            end_of(0, true, 100, 2'000'000, 10),
            end_of(2, false, 100, 3'000'000, 20),
            end_of(1, false, 100, 5'000'000, 30),
            end_of(0, true, 900, 2'100'000, 50),
            device(2, false, "lamp", DeviceState::lost),
            device(2, false, "lamp", DeviceState::back)};
}

TEST(OutputFigures, KeepEachOutputsOwnWidthsEndsAndLosses) {
    const auto events = session();
    const auto figures = output_figures(events);
    ASSERT_EQ(figures.size(), 3U);
    EXPECT_EQ(figures[0].name, "marker");
    EXPECT_TRUE(figures[0].marker);
    EXPECT_EQ(figures[0].ends, 2U);
    EXPECT_EQ(figures[0].width->max, 2'100'000);
    EXPECT_EQ(figures[0].late->p50, 10);
    EXPECT_EQ(figures[1].width->p50, 5'000'000);
    EXPECT_EQ(figures[1].lost, 0U);
    EXPECT_EQ(figures[2].name, "lamp");
    EXPECT_EQ(figures[2].lost, 1U);
}

TEST(OutputFigures, AnOutputThatNeverRoseIsListedWithoutTimes) {
    const std::vector<Event> events{device(0, false, "laser", DeviceState::ready)};
    const auto figures = output_figures(events);
    ASSERT_EQ(figures.size(), 1U);
    EXPECT_EQ(figures[0].ends, 0U);
    EXPECT_FALSE(figures[0].width.has_value());
}

TEST(SessionFigures, CountPulseEndsByTheFirstOutputThatFollowsPulses) {
    EXPECT_EQ(session_figures(session()).pulse_ends, 1U);
}

TEST(SessionTable, APulseLastsAsLongAsItsFirstOutputAndDevicesHaveRows) {
    const auto events = session();
    const auto rows = session_table(events, Hertz{1000.0});
    const auto pulse =
        std::find_if(rows.begin(), rows.end(), [](const auto& row) { return row.trial_type == "pulse"; });
    ASSERT_NE(pulse, rows.end());
    EXPECT_DOUBLE_EQ(pulse->duration_s, 0.005);
    EXPECT_EQ(std::count_if(rows.begin(), rows.end(),
                            [](const auto& row) {
                                return row.trial_type == "device" && row.extra.at("text") == "lamp" &&
                                       row.extra.at("cause") == "lost";
                            }),
              1);
}

} // namespace
} // namespace millpond
