#include "audit/audit.hpp"
#include "audit/audit_text.hpp"
#include "audit/hand_made_session.hpp"
#include "base/refusal.hpp"
#include "recording/events_table.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using namespace test;

constexpr auto unknown = PulseDetail::not_measured;

// A session told event by event, without an engine: every figure is known beforehand.
class ToldSession : public ::testing::Test {
  protected:
    void tell(const Event& event) { writer_->loop_sink().take(event); }
    template <class Detail> void tell(EventKind kind, int code, std::uint64_t at, const Detail& detail) {
        tell(Event::make(kind, static_cast<std::uint8_t>(code), SampleIndex{at}, detail));
    }
    void withheld(std::uint64_t at, Rule rule) {
        tell(EventKind::detection, 0, at, DetectionDetail{});
        tell(EventKind::withheld, static_cast<int>(rule), at, TriggerDetail{at, 0, {}, 0, 0});
    }
    void floor(std::uint64_t at, double mean, bool settled) {
        tell(EventKind::floor, 0, at,
             FloorDetail{mean, 2.0, 25.0F, 0, static_cast<std::uint16_t>(settled ? 1 : 0), at});
    }
    AuditResult audit(const std::optional<Ripples>& labels = {}) {
        AuditInput input;
        input.session = writer_->folder();
        writer_->close(SampleIndex{end});
        input.settings = test_engine_settings();
        input.settings_name = "test";
        input.labels = labels;
        input.labels_name = "labels.tsv";
        return audit_session(input);
    }
    static const LatencyRow& row(const AuditResult& result, const std::string& part, const std::string& over) {
        for (const auto& candidate : result.latency) {
            if (candidate.part == part && candidate.over == over) {
                return candidate;
            }
        }
        throw std::runtime_error("no row " + part);
    }

    std::uint64_t end = 12'500;
    TemporaryFolder temp_;
    std::unique_ptr<SessionWriter> writer_ = SessionWriter::open(session_in(temp_), about_stream());
};

TEST_F(ToldSession, LatencyOverPulsesIsExact) {
    for (std::int64_t i = 1; i <= 1000; ++i) { // 1 to 1000 us, not in order
        const auto us = (i * 7) % 1000 + 1;
        tell(EventKind::pulse, 0, static_cast<std::uint64_t>(i), PulseDetail{0, unknown, 1000 * us, 10 * us, us});
        tell(EventKind::pulse_end, 0, static_cast<std::uint64_t>(i), PulseEndDetail{5'000'000, 2 * us});
    }
    const auto result = audit();
    // Nearest rank by hand: the 500th, 900th, 990th, 999th of 1..1000.
    EXPECT_EQ(row(result, "wake", "pulses").figures,
              (LatencySummary{1000, 500'000, 900'000, 990'000, 999'000, 1'000'000}));
    EXPECT_EQ(row(result, "compute", "pulses").figures, (LatencySummary{1000, 5'000, 9'000, 9'900, 9'990, 10'000}));
    EXPECT_EQ(row(result, "packing", "pulses").figures, (LatencySummary{1000, 0, 0, 0, 0, 0})) << "measured, and 0";
    EXPECT_EQ(row(result, "pulse end", "pulses").figures, (LatencySummary{1000, 1000, 1800, 1980, 1998, 2000}));
    EXPECT_EQ(result.figures.pulses, 1000U);
}

TEST_F(ToldSession, WhatWasNotMeasuredIsSaidToBeAndNeverZero) {
    tell(EventKind::pulse, 0, 10, PulseDetail{1000, unknown, unknown, 2000, 3000});
    const auto result = audit();
    EXPECT_FALSE(row(result, "transport", "pulses").figures.has_value());
    EXPECT_FALSE(row(result, "wake", "pulses").figures.has_value());
    EXPECT_FALSE(row(result, "line", "pulses").figures.has_value());
    EXPECT_FALSE(row(result, "loop", "packets").figures.has_value());
    const auto json = audit_json(result);
    for (const auto& latency : json.at("latency")) {
        EXPECT_EQ(latency.at("measured").get<bool>(), latency.contains("p50_ns")) << latency;
    }
    EXPECT_NE(audit_text(result).find("not measured"), std::string::npos);
}

TEST_F(ToldSession, LatencyOverPacketsAddsUpTheHistograms) {
    for (int i = 0; i < 64; ++i) {
        writer_->time_packet({unknown, i, 63}); // below 64 ns the bins are exact
    }
    const auto result = audit();
    EXPECT_EQ(row(result, "wake", "packets").figures, (LatencySummary{64, 31, 57, 63, 63, 63}));
    EXPECT_EQ(row(result, "loop", "packets").figures, (LatencySummary{64, 63, 63, 63, 63, 63}));
    EXPECT_FALSE(row(result, "transport", "packets").figures.has_value());
}

TEST_F(ToldSession, CountsAndListsAreThoseOfTheEvents) {
    tell(EventKind::gate, 0, 0, GateDetail{1, {"still"}});
    tell(EventKind::state, 0, 0, StateDetail{0, 0});
    tell(EventKind::state, 1, 100, StateDetail{0, static_cast<std::uint8_t>(StateCause::command)});
    withheld(200, Rule::veto);
    withheld(300, Rule::veto);
    withheld(400, Rule::second_limit);
    tell(EventKind::gap, static_cast<int>(GapCause::packet_loss), 500, GapDetail{20});
    tell(EventKind::gap, static_cast<int>(GapCause::non_finite), 600, GapDetail{3});
    tell(EventKind::packet_count, static_cast<int>(PacketCause::lost), 700, CountDetail{4});
    tell(EventKind::packet_count, static_cast<int>(PacketCause::lost), 800, CountDetail{1});
    floor(1250, 2.0, false);
    floor(2500, 10.0, true);
    floor(3750, 12.0, true);
    floor(5000, 11.0, true);
    NoteDetail note{5, 0, {}};
    std::copy_n("sleep", 5, note.text.begin());
    tell(EventKind::note, 0, 900, note);

    const auto result = audit();
    const auto& f = result.figures;
    EXPECT_EQ(f.detections, 3U);
    EXPECT_EQ(f.withheld[static_cast<std::size_t>(Rule::veto)], 2U);
    EXPECT_EQ(f.withheld[static_cast<std::size_t>(Rule::second_limit)], 1U);
    EXPECT_EQ(f.gaps.size(), 2U);
    EXPECT_EQ(f.frames_missing(), 23U);
    EXPECT_EQ(f.packets[static_cast<std::size_t>(PacketCause::lost)], 5U);
    ASSERT_EQ(f.states.size(), 2U);
    EXPECT_EQ(f.states[1].cause, StateCause::command);
    ASSERT_EQ(f.gates.size(), 1U);
    EXPECT_EQ(f.gates[0].name, "still");
    ASSERT_EQ(f.notes.size(), 1U);
    EXPECT_EQ(f.notes[0].text, "sleep");
    ASSERT_EQ(f.floors.size(), 1U);
    EXPECT_EQ(f.floors[0].settled_at, SampleIndex{2500});
    EXPECT_EQ(f.floors[0].mean_least, 10.0);
    EXPECT_EQ(f.floors[0].mean_median, 11.0);
    EXPECT_EQ(f.floors[0].mean_most, 12.0);
    EXPECT_TRUE(result.objections().empty());

    const auto json = audit_json(result);
    EXPECT_EQ(json["decisions"]["withheld"]["veto"], 2);
    EXPECT_EQ(json["stream"]["frames_missing"], 23);
    EXPECT_EQ(json["stream"]["packets"]["lost"], 5);
    const auto text = audit_text(result);
    EXPECT_NE(text.find("0.400 s (sample 500): 20 frames (16.0 ms), packet loss"), std::string::npos) << text;
    EXPECT_NE(text.find("0.720 s (sample 900): sleep"), std::string::npos) << text;
}

TEST_F(ToldSession, LabelsGiveHitsMissesFalseAndRepeats) {
    tell(EventKind::state, 1, 0, StateDetail{0, 0}); // armed from the start
    floor(1250, 10.0, true);
    const auto detect = [this](std::uint64_t at) {
        tell(EventKind::detection, 0, at, DetectionDetail{});
        tell(EventKind::withheld, static_cast<int>(Rule::gate), at, TriggerDetail{at, 0, {}, 0, 0});
    };
    detect(5'025); // first of the first ripple: 20 ms after its onset
    detect(5'050); // a repeat
    detect(8'000); // of none
    const auto ripple = [](std::uint64_t onset) {
        return Ripple{SampleIndex{onset}, SampleIndex{onset + 60}, SampleIndex{onset + 125}, 0.0};
    };
    const Ripples labels{ripple(5'000), ripple(10'000)};
    const auto result = audit(labels);
    ASSERT_TRUE(result.score.has_value());
    const auto& s = result.score->detector;
    EXPECT_EQ(s.hits, 1U);
    EXPECT_EQ(s.repeats, 1U);
    EXPECT_EQ(s.misses, 1U);
    EXPECT_EQ(s.false_detections, 1U);
    EXPECT_EQ(s.early_ms, 0.0);
    EXPECT_DOUBLE_EQ(s.onset_latency_ms.median, 20.0);
    EXPECT_EQ(result.score->session.hits, 1U);
    EXPECT_NE(audit_text(result).find("hits 1, misses 1, false 1, repeats 1"), std::string::npos);
}

TEST_F(ToldSession, AdvisesControlsWherePulsesFollowedDetectionsAtOnce) {
    tell(EventKind::order, 0, 5'000, TriggerDetail{5'000, 1, PulseOrigin::trigger, 0, 0});
    tell(EventKind::pulse, 0, 5'000, PulseDetail{0, 0, 0, 0, 0});
    EXPECT_NE(audit_text(audit(Ripples{})).find("from control sessions"), std::string::npos);
}

TEST_F(ToldSession, OfAControlScheduleIsNotAdvisedToUseOne) {
    tell(EventKind::order, 0, 5'000, TriggerDetail{5'000, 1, PulseOrigin::schedule, 0, 0});
    tell(EventKind::pulse, 0, 5'000, PulseDetail{0, 0, 0, 0, 0});
    const auto result = audit(Ripples{});
    EXPECT_EQ(audit_text(result).find("from control sessions"), std::string::npos);
    EXPECT_NE(audit_text(result).find("Delayed or scheduled pulses were given"), std::string::npos);
    EXPECT_EQ(audit_json(result)["score"]["pulses_scheduled"], true);
}

TEST_F(ToldSession, DroppedEventsAreAnObjection) {
    tell(EventKind::dropped, static_cast<int>(Dropped::events), 100, CountDetail{7});
    const auto objections = audit().objections();
    ASSERT_EQ(objections.size(), 1U);
    EXPECT_EQ(objections[0], "7 events dropped by the journal");
}

AuditResult audit_of(const std::filesystem::path& folder, const EngineSettings& settings) {
    AuditInput input;
    input.session = folder;
    input.settings = settings;
    input.settings_name = "test";
    return audit_session(input);
}

TEST(Audit, EventfulSessionIsReproducedAndScoredByTheReferee) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto result = audit_of(loop.close(), loop.settings());
    EXPECT_TRUE(result.objections().empty());
    ASSERT_TRUE(result.score.has_value());
    EXPECT_EQ(result.score->truth, "referee");
    EXPECT_EQ(result.score->detector.early_ms, referee_early_ms);
    EXPECT_GT(result.score->detector.hits, 10U);
    EXPECT_LT(result.score->session.eligible_minutes, result.score->detector.eligible_minutes);
    EXPECT_NE(audit_text(result).find("every decision reproduced, all records intact"), std::string::npos);
}

TEST(Audit, FlippedBitIsNamedByPlaceAndTheMissingRecordShowsInTheReRun) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto folder = loop.close();
    const auto trigger = first_of(folder, EventKind::trigger);
    const auto byte = record_header_bytes + trigger.sequence * record_bytes;
    flip_bit(folder / "records.mpj", byte + 20);
    const auto result = audit_of(folder, loop.settings());
    ASSERT_EQ(result.damage.size(), 1U);
    EXPECT_EQ(result.damage[0].record, trigger.sequence);
    EXPECT_EQ(result.damage[0].byte, byte);
    EXPECT_EQ(result.rerun.differences.size(), 1U);
    EXPECT_EQ(result.objections().size(), 2U);
    EXPECT_NE(audit_text(result).find("record " + std::to_string(trigger.sequence)), std::string::npos);
}

TEST(Audit, WritesTablesAndNeverOverwritesUnasked) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto result = audit_of(loop.close(), loop.settings());
    const auto out = temp.path() / "out";
    write_audit(result, out, false);
    EXPECT_EQ(nlohmann::json::parse(text_of(out / "audit.json")).at("rerun").at("reproduced"), true);
    EXPECT_EQ(read_events_table(out / "ripples.tsv", 1250.0).size(), result.score->ripples.size());
    EXPECT_EQ(read_events_table(out / "gaps.tsv", 1250.0).size(), result.figures.gaps.size());
    EXPECT_THROW(write_audit(result, out, false), Refusal);
    EXPECT_NO_THROW(write_audit(result, out, true));
}

} // namespace
} // namespace millpond
