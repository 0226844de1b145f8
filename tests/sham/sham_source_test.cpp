// Sources that are session folders, told event by event.
#include "app/sham_options.hpp"
#include "app/sham_source.hpp"
#include "assignment/unblinding.hpp"
#include "base/refusal.hpp"
#include "journal/session_support.hpp"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

#include <algorithm>

namespace millpond {
namespace {

using test::TemporaryFolder;

class SourceFolder : public ::testing::Test {
  protected:
    void tell(EventKind kind, std::uint64_t at) {
        events_.push_back(Event::make(kind, 0, SampleIndex{at}, TriggerDetail{at, 1, PulseOrigin::trigger, 0, 0}));
    }
    void state(ArmState state, std::uint64_t at, StateCause cause) {
        StateDetail detail{};
        detail.cause = static_cast<std::uint8_t>(cause);
        events_.push_back(Event::make(EventKind::state, static_cast<std::uint8_t>(state), SampleIndex{at}, detail));
    }
    void epoch(const std::string& name, std::uint64_t at) {
        EpochDetail detail{};
        std::copy(name.begin(), name.end(), detail.name.begin());
        events_.push_back(Event::make(EventKind::epoch, 0, SampleIndex{at}, detail));
    }
    std::filesystem::path close() {
        const auto writer = SessionWriter::open(test::session_in(folder_), about_);
        for (const auto& event : events_) {
            writer->loop_sink().take(event);
        }
        writer->close(SampleIndex{100'000});
        return writer->folder();
    }

    const TemporaryFolder folder_;
    SessionAbout about_ = test::about_stream();
    std::vector<Event> events_;
};

TEST_F(SourceFolder, GivesItsOrdersItsRateAndItsMoments) {
    state(ArmState::not_armed, 10, StateCause::start);
    state(ArmState::armed, 5'000, StateCause::command);
    state(ArmState::not_armed, 6'000, StateCause::command);
    state(ArmState::armed, 7'000, StateCause::command);
    epoch("rest 2", 20'000);
    tell(EventKind::trigger, 8'000);
    tell(EventKind::order, 8'200);
    const auto source = read_sham_source(close(), {}, "x");
    EXPECT_TRUE(source.given);
    EXPECT_EQ(source.places, (Schedule{SampleIndex{8'200}}));
    EXPECT_EQ(source.rate, Hertz{1250.0});
    EXPECT_EQ(moment_of(source, "first"), SampleIndex{10});
    EXPECT_EQ(moment_of(source, "armed"), SampleIndex{5'000});
    EXPECT_EQ(moment_of(source, "rest 2"), SampleIndex{20'000});
    EXPECT_THROW(static_cast<void>(moment_of(source, "rest 1")), Refusal);
}

TEST_F(SourceFolder, ThatIsSealedGivesTriggersSoThatNobodyLearnsItsCondition) {
    SessionAssignment kept;
    kept.code = "A1";
    kept.sealed = true;
    about_.more["assignment"] = nlohmann::json::parse(to_json_text(kept));
    tell(EventKind::trigger, 8'000);
    tell(EventKind::order, 8'200);
    const auto source = read_sham_source(close(), {}, "x");
    EXPECT_EQ(source.places, (Schedule{SampleIndex{8'000}}));
    EXPECT_NE(source.told().find("sealed"), std::string::npos) << source.told();
}

TEST_F(SourceFolder, LendsItsOwnLimitsWhereNoneAreGiven) {
    about_.settings_text = "arbiter: {lockout_ms: 400}\n"
                           "limits: {max_pulses_per_second: 2, max_pulses_per_minute: 50, min_interval_ms: 600}\n"
                           "plan: {epochs: [{name: rest, minutes: 2}, {name: track}, {name: rest 2}]}\n";
    tell(EventKind::trigger, 8'000);
    ShamOptions options;
    options.take_source(close());
    const auto limits = options.limits();
    EXPECT_EQ(limits.lockout_ms, 600.0) << "the least interval is longer";
    EXPECT_EQ(limits.max_pulses_per_second, 2U);
    EXPECT_EQ(limits.max_pulses_per_minute, 50U);
    EXPECT_EQ(limits.epoch_starts_s, (std::vector<double>{0.0, 120.0})) << "nobody knows when rest 2 will begin";
    EXPECT_EQ(options.rate(), Hertz{1250.0});
}

} // namespace
} // namespace millpond
