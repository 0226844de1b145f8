#include "audit/hand_made_session.hpp"
#include "audit/rerun.hpp"
#include "audit/session_figures.hpp"
#include "journal/session_tables.hpp"

#include <gtest/gtest.h>

#include <algorithm>

namespace millpond {
namespace {

using namespace test;

std::string all(const Rerun& rerun) {
    std::string text = rerun.why_not;
    for (const auto& difference : rerun.differences) {
        text += difference.what + "\n";
    }
    return text;
}

TEST(Rerun, ReproducesEveryDecisionOfAnEventfulSession) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const SessionReader session(loop.close());
    const auto rerun = rerun_session(session, loop.settings(), "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_EQ(rerun.upto, session.end());

    // The session had something to reproduce.
    const auto figures = session_figures(session.events());
    EXPECT_GT(figures.triggers, 0U);
    for (const auto rule : {Rule::faulted, Rule::not_armed, Rule::gate, Rule::lock_out}) {
        EXPECT_GT(figures.withheld[static_cast<std::size_t>(rule)], 0U) << name_of(rule);
    }
    EXPECT_GE(figures.gaps.size(), 2U) << "lost packets, and not-a-number over several blocks";
    EXPECT_GT(rerun.decisions, 20U);
}

TEST(Rerun, ReproducesASessionThatStartedArmedFromAnEarlierFloor) {
    const TemporaryFolder temp;
    auto settings = test_engine_settings();
    settings.arbiter.start_armed = true;
    settings.detector.vote.rule = VoteRule::count;
    const std::vector<FloorDetail> floors{{17.123456789, 6.1, 0.0F, 0, 0, 99'999}, {16.9, 6.0, 0.0F, 1, 0, 99'999}};
    HandMadeLoop loop(temp, settings, {}, StoreSamples::w64, floors);
    run_eventful(loop);
    const SessionReader session(loop.close());
    const auto rerun = rerun_session(session, settings, "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_GT(rerun.decisions, 20U);
}

TEST(Rerun, ReproducesAControlScheduleFromThePlacesTheJournalNames) {
    const TemporaryFolder temp;
    auto settings = test_engine_settings();
    settings.arbiter.start_armed = true;
    settings.arbiter.condition = Condition::yoked;
    const std::vector<SampleIndex> schedule{{4'001}, {8'000}, {14'100}, {20'000}}; // the third lies in the gap
    HandMadeLoop loop(temp, settings, schedule);
    run_eventful(loop);
    const SessionReader session(loop.close());
    const auto rerun = rerun_session(session, settings, "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_EQ(session_figures(session.events()).orders[1], 2U) << "one in the gap, one after the fault";
}

// Theta from the 20th to the 40th second, and a command to another gate in between.
TEST(Rerun, FindsTheGateOfTheStateAgainFromTheSamplesAlone) {
    for (const auto method : {DetectionMethod::envelope, DetectionMethod::evidence}) {
        const TemporaryFolder temp;
        auto settings = test_engine_settings();
        settings.detector.method = method;
        settings.detector.state_gate.on = true;
        settings.detector.mains.method = MainsMethod::adaptive;
        settings.arbiter.start_armed = true;
        HandMadeLoop loop(temp, settings);
        auto data = bursts(75'000);
        for (std::size_t i = 0; i < 75'000; ++i) {
            const bool theta = i >= 25'000 && i < 50'000;
            const double turns = (theta ? 7.5 : 2.0) * static_cast<double>(i) / test_rate.value;
            const auto wave = static_cast<float>(300.0 * std::sin(2.0 * std::numbers::pi * turns));
            data[2 * i] += wave;
            data[2 * i + 1] += wave;
        }
        for (std::size_t at = 0; at < 75'000; at += 8) {
            if (at == 40'000 || at == 60'000) {
                loop.engine().set_gate("still", at == 60'000);
            }
            if (at < 66'000 || at >= 66'400) { // packets that never came
                loop.block(SampleIndex{at}, std::span(data).subspan(2 * at, 16));
            }
        }
        const SessionReader session(loop.close());
        const auto rerun = rerun_session(session, settings, "test");
        EXPECT_TRUE(rerun.reproduced()) << all(rerun);
        EXPECT_GT(rerun.decisions, 20U);
        std::size_t moves = 0;
        for (const auto& event : session.events()) {
            moves += event.kind == EventKind::gate && gate_name(event.as<GateDetail>()) == state_gate_name ? 1 : 0;
        }
        EXPECT_EQ(moves, 3U) << "open from the start, closed, open";
    }
}

TEST(Rerun, CutSessionIsReproducedAsFarAsItsRecordsGo) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto settings = loop.settings();
    const SessionReader session(loop.cut());
    const auto rerun = rerun_session(session, settings, "test");
    EXPECT_TRUE(session.cut());
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_EQ(rerun.upto_why, "the journal was cut there");
    EXPECT_GT(rerun.decisions, 20U);
}

TEST(Rerun, SamplesThatEndBeforeTheJournalEndTheComparison) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    const auto data = bursts(10'000);
    loop.block(SampleIndex{0}, std::span(data).first(2 * 6'000));
    loop.stop_storing();
    loop.block(SampleIndex{6'000}, std::span(data).subspan(2 * 6'000));
    const SessionReader session(loop.close());
    const auto rerun = rerun_session(session, loop.settings(), "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_EQ(rerun.upto, SampleIndex{6'000});
    EXPECT_EQ(rerun.upto_why, "the stored samples end there");
}

TEST(Rerun, FramesThatTheJournalDroppedEndTheComparison) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    const auto data = bursts(10'000);
    loop.block(SampleIndex{0}, std::span(data).first(2 * 5'000));
    loop.stop_storing(); // as if the ring had been full
    loop.block(SampleIndex{5'000}, std::span(data).subspan(2 * 5'000, 2 * 100));
    loop.writer().loop_sink().take(Event::make(EventKind::dropped, static_cast<std::uint8_t>(Dropped::frames),
                                               SampleIndex{5'000}, CountDetail{100}));
    const SessionReader session(loop.close());
    const auto rerun = rerun_session(session, loop.settings(), "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_EQ(rerun.upto, SampleIndex{5'000});
}

TEST(Rerun, ReproducesASessionOfEvidenceInWhichASiteDiesAndTellsOfIt) {
    const TemporaryFolder temp;
    auto settings = test_engine_settings();
    settings.detector.method = DetectionMethod::evidence;
    HandMadeLoop loop(temp, settings);
    auto data = bursts(10'000);
    for (std::size_t frame = 5'000; frame < 10'000; ++frame) {
        data[2 * frame + 1] = 12.0F; // flat
    }
    loop.block(SampleIndex{0}, data);
    const SessionReader session(loop.close());
    const auto rerun = rerun_session(session, loop.settings(), "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    const auto& events = session.events();
    const auto site =
        std::find_if(events.begin(), events.end(), [](const Event& event) { return event.kind == EventKind::site; });
    ASSERT_NE(site, events.end());
    EXPECT_EQ(site->as<SiteDetail>().channel, 1);
    EXPECT_EQ(site->code, static_cast<std::uint8_t>(SiteState::flat));
    EXPECT_LE(site->sample.value, 5'000U + 2 * 1'250U) << "a whole second of it, and no more than the one before";
    const auto figures = session_figures(events);
    ASSERT_EQ(figures.sites.size(), 1U);
    EXPECT_EQ(figures.sites[0].channel, 1);
    const auto rows = session_table(events, Hertz{1250.0});
    EXPECT_TRUE(std::any_of(rows.begin(), rows.end(), [](const TableEvent& row) {
        return row.trial_type == "site" && row.extra.at("cause") == "flat";
    }));
}

TEST(Rerun, ForgedVerdictIsReportedAsADifference) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto folder = loop.close();
    auto forged = first_of(folder, EventKind::trigger);
    forged.kind = EventKind::withheld;
    forged.code = static_cast<std::uint8_t>(Rule::veto);
    forge_record(folder, forged);
    const SessionReader session(folder);
    EXPECT_TRUE(session.damage().empty()) << "the checksum was forged too";
    const auto rerun = rerun_session(session, loop.settings(), "test");
    ASSERT_EQ(rerun.differences.size(), 1U) << all(rerun);
    EXPECT_EQ(rerun.differences[0].at, forged.sample);
    const auto at = std::to_string(forged.sample.value);
    EXPECT_EQ(rerun.differences[0].what, "journal: withheld at " + at + " (veto); re-run: trigger at " + at);
}

TEST(Rerun, OneChangedBitOfADetectionsDetailIsADifference) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto folder = loop.close();
    auto forged = first_of(folder, EventKind::detection);
    forged.detail[0] ^= 1; // the last bit of the envelope
    forge_record(folder, forged);
    EXPECT_EQ(rerun_session(SessionReader(folder), loop.settings(), "test").differences.size(), 1U);
}

TEST(Rerun, OtherSettingsThanTheSessionsGiveDifferences) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const SessionReader session(loop.close());
    auto settings = loop.settings();
    settings.detector.threshold.deviations += 0.5;
    EXPECT_FALSE(rerun_session(session, settings, "test").reproduced());
}

TEST(Rerun, SessionWithoutSamplesIsNotRunAgainAndSaysSo) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings(), {}, StoreSamples::none);
    run_eventful(loop);
    const auto rerun = rerun_session(SessionReader(loop.close()), loop.settings(), "test");
    EXPECT_FALSE(rerun.done);
    EXPECT_FALSE(rerun.reproduced());
    EXPECT_NE(rerun.why_not.find("stored no samples"), std::string::npos);
}

TEST(CompareEvents, SaysWhichSideLacksWhat) {
    const auto detection = Event::make(EventKind::detection, 0, SampleIndex{5}, DetectionDetail{});
    const auto gap = Event::make(EventKind::gap, 1, SampleIndex{9}, GapDetail{3});
    const auto found = compare_events({detection}, {gap});
    ASSERT_EQ(found.size(), 2U);
    EXPECT_EQ(found[0].what, "only in the journal: detection at 5");
    EXPECT_EQ(found[1].what, "only in the re-run: gap at 9 (packet loss, 3 frames)");
}

TEST(CompareEvents, TimeStampsAndSequenceNumbersDoNotCount) {
    auto a = Event::make(EventKind::detection, 0, SampleIndex{5}, DetectionDetail{});
    auto b = a;
    b.time_ns = 17;
    b.sequence = 3;
    EXPECT_TRUE(compare_events({a}, {b}).empty());
}

} // namespace
} // namespace millpond
