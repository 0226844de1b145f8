// Plan, limits and gates in an audit: figures by epoch, and the re-run that finds all of them again.
#include "audit/audit.hpp"
#include "audit/audit_text.hpp"
#include "audit/hand_made_session.hpp"
#include "journal/session_tables.hpp"

#include <gtest/gtest.h>

namespace millpond {
namespace {

using namespace test;

constexpr std::size_t second = 1250;

std::string all(const Rerun& rerun) {
    std::string text = rerun.why_not;
    for (const auto& difference : rerun.differences) {
        text += difference.what + "\n";
    }
    return text;
}

EngineSettings limited() {
    auto settings = test_engine_settings();
    settings.arbiter.start_armed = true;
    settings.arbiter.lockout_ms = 150.0;
    settings.arbiter.speed_gate.on = true;
    auto& limits = settings.arbiter.limits;
    limits.max_pulses_per_second = 1;
    limits.max_pulses_per_epoch = 5;
    limits.max_gaps_per_minute = 1;
    limits.floor.most_times = 1.3;
    limits.runaway.expected_per_s = 0.1;
    limits.runaway.window_s = 8.0;
    limits.runaway.false_alarms_per_hour = 0.1;
    settings.arbiter.plan.epochs = {
        {"rest 1", 8.0037 / 60.0, false}, {"track", 0.0, true}, {"rest 2", 20.0 / 60.0, true}};
    return settings;
}

/// 60 s with every limit, guard, gate and epoch at work; bursts every 700 ms.
void run_limited(HandMadeLoop& loop) {
    auto data = bursts(60 * second);
    for (std::size_t i = 2 * 45 * second; i < data.size(); ++i) {
        data[i] *= 4.0F;
    }
    auto& engine = loop.engine();
    constexpr std::size_t block = 10;
    for (std::size_t at = 0; at < 60 * second; at += block) {
        if (at == 6 * second || at == 20 * second) {
            engine.set_gate(speed_gate_name, true, {ChangeSource::speed});
        } else if (at == 18 * second) {
            engine.set_gate(speed_gate_name, false, {ChangeSource::speed});
        } else if (at == 22 * second) {
            engine.set_gate("still", false, {ChangeSource::command, 4711, 0x7F000001});
        } else if (at == 23 * second) {
            engine.set_gate("still", true, {ChangeSource::command, 4711, 0x7F000001});
        } else if (at == 26 * second) {
            engine.next_epoch({ChangeSource::command, 4711, 0x7F000001});
        } else if (at == 30 * second || at == 44 * second) {
            engine.set_state(ArmState::armed, StateCause::command, {ChangeSource::command, 4711, 0x7F000001});
        } else if (at == 58 * second) {
            engine.set_state(ArmState::faulted, StateCause::emergency_stop, {ChangeSource::signal});
        }
        if ((at >= 31 * second && at < 31 * second + 50) || (at >= 33 * second && at < 33 * second + 50)) {
            continue; // packets that never came
        }
        loop.block(SampleIndex{at}, std::span(data).subspan(2 * at, 2 * block));
    }
}

TEST(RerunOfLimits, FindsEveryFaultGateAndEpochAgain) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, limited());
    run_limited(loop);
    const SessionReader session(loop.close());
    std::vector<std::string> causes;
    for (const auto& state : session_figures(session.events()).states) {
        causes.emplace_back(name_of(state.cause));
    }
    for (const auto* cause : {"runaway", "too many gaps", "floor out of range", "emergency stop"}) {
        EXPECT_GE(std::count(causes.begin(), causes.end(), cause), 1) << cause << ": else nothing is shown";
    }
    const auto rerun = rerun_session(session, loop.settings(), "test");
    EXPECT_TRUE(rerun.reproduced()) << all(rerun);
    EXPECT_GT(rerun.decisions, 60U);
    EXPECT_EQ(session_figures(session.events()).epochs.size(), 4U);
}

TEST(RerunOfLimits, AForgedFaultIsADifference) {
    const TemporaryFolder temp;
    auto settings = limited();
    HandMadeLoop loop(temp, settings);
    run_limited(loop);
    const SessionReader session(loop.close());
    settings.arbiter.limits.runaway.on = false; // so none is found again
    const auto rerun = rerun_session(session, settings, "test");
    EXPECT_FALSE(rerun.reproduced());
    EXPECT_NE(all(rerun).find("only in the journal: state at "), std::string::npos) << all(rerun);
}

/// Told event by event: one epoch without pulses, one with, in a session of 60 s.
class ToldPlan : public ::testing::Test {
  protected:
    template <class Detail> void tell(EventKind kind, int code, std::uint64_t at, const Detail& detail) {
        writer_->loop_sink().take(Event::make(kind, static_cast<std::uint8_t>(code), SampleIndex{at}, detail));
    }
    void epoch(std::uint64_t at, std::uint16_t index, const std::string& name, bool pulses, const ChangedBy& by) {
        EpochDetail detail{};
        detail.index = index;
        detail.pulses = pulses ? 1 : 0;
        detail.frames = pulses ? 0 : 30 * second;
        std::copy(name.begin(), name.end(), detail.name.begin());
        set_by(detail, by);
        tell(EventKind::epoch, 0, at, detail);
    }
    void detection(std::uint64_t at, Rule rule) {
        tell(EventKind::detection, 0, at, DetectionDetail{});
        tell(rule == Rule::none ? EventKind::trigger : EventKind::withheld, static_cast<int>(rule), at,
             TriggerDetail{at, 0, PulseOrigin::trigger, 0, 0});
        if (rule == Rule::none) {
            tell(EventKind::pulse, 0, at, PulseDetail{0, 0, 0, 0, 0});
        }
    }
    AuditResult audit() {
        AuditInput input;
        input.session = writer_->folder();
        writer_->close(SampleIndex{60 * second});
        input.settings = test_engine_settings();
        input.settings_name = "test";
        // One ripple in the first epoch, hit; two in the second, one of them hit.
        input.labels =
            Ripples{{SampleIndex{20 * second}, SampleIndex{20 * second}, SampleIndex{20 * second + 100}, 0.0},
                    {SampleIndex{40 * second}, SampleIndex{40 * second}, SampleIndex{40 * second + 100}, 0.0},
                    {SampleIndex{50 * second}, SampleIndex{50 * second}, SampleIndex{50 * second + 100}, 0.0}};
        input.labels_name = "labels.tsv";
        return audit_session(input);
    }

    TemporaryFolder temp_;
    std::unique_ptr<SessionWriter> writer_ = SessionWriter::open(session_in(temp_), about_stream());
};

TEST_F(ToldPlan, FiguresByEpochAreThoseOfWhatFellIntoEach) {
    epoch(0, 0, "rest 1", false, {ChangeSource::plan});
    tell(EventKind::state, 1, 0, StateDetail{0, 0});
    tell(EventKind::floor, 0, second, FloorDetail{10.0, 2.0, 25.0F, 0, 1, second});
    detection(20 * second + 10, Rule::gate);
    epoch(30 * second, 1, "track", true, {ChangeSource::command, 4711, 0x7F000001});
    detection(40 * second + 20, Rule::none);
    detection(45 * second, Rule::none); // of no ripple
    const auto result = audit();

    const auto& epochs = result.figures.epochs;
    ASSERT_EQ(epochs.size(), 2U);
    EXPECT_EQ(epochs[0].name, "rest 1");
    EXPECT_EQ(epochs[0].to, SampleIndex{30 * second});
    EXPECT_EQ(epochs[0].detections, 1U);
    EXPECT_EQ(epochs[0].triggers, 0U);
    EXPECT_EQ(epochs[0].withheld[static_cast<std::size_t>(Rule::gate)], 1U);
    EXPECT_EQ(epochs[1].to, SampleIndex{60 * second}) << "the session's end";
    EXPECT_EQ(epochs[1].detections, 2U);
    EXPECT_EQ(epochs[1].pulses, 2U);

    ASSERT_TRUE(result.score);
    ASSERT_EQ(result.score->epochs.size(), 2U);
    EXPECT_EQ(result.score->epochs[0].detector.hits, 1U);
    EXPECT_EQ(result.score->epochs[0].detector.misses, 0U);
    EXPECT_EQ(result.score->epochs[0].session.eligible_minutes, 0.0) << "no trigger was possible there";
    EXPECT_EQ(result.score->epochs[1].session.hits, 1U);
    EXPECT_EQ(result.score->epochs[1].session.misses, 1U);
    EXPECT_EQ(result.score->epochs[1].session.false_detections, 1U);
    EXPECT_NEAR(result.score->epochs[1].session.eligible_minutes, 0.5, 0.05);
    EXPECT_EQ(result.score->session.hits, 1U) << "the whole session's reading leaves rest 1 out too";

    const auto json = audit_json(result);
    EXPECT_EQ(json["epochs"][0]["name"], "rest 1");
    EXPECT_EQ(json["epochs"][0]["planned_minutes"], 0.5);
    EXPECT_TRUE(json["epochs"][1]["planned_minutes"].is_null());
    EXPECT_EQ(json["epochs"][1]["begun_by"], "command from 127.0.0.1:4711");
    EXPECT_EQ(json["epochs"][1]["score"]["session"]["hits"], 1);
    const auto text = audit_text(result);
    EXPECT_NE(text.find("track: from 30.000 s (sample 37500), 0.50 minutes, pulses allowed, begun by command from "
                        "127.0.0.1:4711\n    2 detections, 2 triggers, 2 pulses\n"),
              std::string::npos)
        << text;
    const auto rows = session_table(SessionReader(result.session).events(), test_rate);
    EXPECT_EQ(std::count_if(
                  rows.begin(), rows.end(),
                  [](const TableEvent& row) { return row.trial_type == "epoch" && row.extra.at("text").size() > 4; }),
              2);
}

TEST_F(ToldPlan, EveryChangeSaysWhoMadeIt) {
    StateDetail state{0, static_cast<std::uint8_t>(StateCause::emergency_stop)};
    set_by(state, {ChangeSource::signal});
    tell(EventKind::state, 2, 100, state);
    GateDetail gate{0, {"speed"}};
    set_by(gate, {ChangeSource::speed});
    tell(EventKind::gate, 0, 200, gate);
    tell(EventKind::speed, 0, 200, SpeedDetail{12.5, 1000, 40});
    const auto result = audit();
    const auto json = audit_json(result);
    EXPECT_EQ(json["stream"]["states"][0]["cause"], "emergency stop");
    EXPECT_EQ(json["stream"]["states"][0]["by"], "signal");
    EXPECT_EQ(json["stream"]["gates"][0]["by"], "speed");
    EXPECT_EQ(json["stream"]["speed"]["values"], 40);
    EXPECT_EQ(json["stream"]["speed"]["most"], 12.5);
    const auto text = audit_text(result);
    EXPECT_NE(text.find("gate speed closed, by speed"), std::string::npos) << text;
    EXPECT_NE(text.find("faulted (emergency stop)"), std::string::npos) << text;
}

} // namespace
} // namespace millpond
